import { createRequire } from 'node:module'
import type * as Library from 'kafkajs-feeds'
import { batchOverhead, type RecordBatch } from './record-batch.ts'

/**
 * kafkajs does the group, the wire and the offsets; record batches are walked here. Its own decoder makes
 * several objects of every record (2.6 against 0.4 µs of CPU a record), and
 * one batch that cannot be decompressed would stop it for good. So the copy of kafkajs that feeds use
 * (installed as `kafkajs-feeds`, pinned to 2.2.4) gets this decoder in place of
 * `protocol/recordBatch/v0/decoder.js`: each batch travels through it as one message that carries the whole.
 */
const require = createRequire(import.meta.url)

/** A message as the replaced decoder makes it; with `batch`, the rest is of no meaning. */
export interface PackedMessage {
  readonly offset: string
  readonly value: Buffer | null
  readonly batch?: RecordBatch
}

/** What of kafkajs's decoder over a fetch response is used. */
interface FetchDecoder {
  readonly buffer: Buffer
  readonly offset: number
  forward(bytes: number): void
}

/** What kafkajs takes for the cut end of a fetch response. */
function partial(): Error {
  const { KafkaJSPartialMessageError } = require('kafkajs-feeds/src/errors.js')
  return new KafkaJSPartialMessageError('an incomplete record batch')
}

const controlFlag = 32
const transactionFlag = 16

/** The key of a control record says whether it ends an aborted transaction; kafkajs looks at it. */
function controlKey(records: Buffer): Buffer | null {
  // length, attributes, time, offset and length of key: one byte each as brokers write them, but the time.
  let p = 2
  while (p < records.length && records[p]! > 127) p++
  const key = p + 3
  return records.length >= key + 4 ? records.subarray(key, key + 4) : null
}

async function decodePacked(decoder: FetchDecoder): Promise<{ records: unknown[] }> {
  const { buffer, offset: at } = decoder
  const end = at + 12 + buffer.readInt32BE(at + 8)
  if (end > buffer.length || end < at + batchOverhead) throw partial()
  decoder.forward(end - at)
  const base = buffer.readBigInt64BE(at)
  const attributes = buffer.readInt16BE(at + 21)
  const lastDelta = buffer.readInt32BE(at + 23)
  const isControl = (attributes & controlFlag) > 0
  const records = buffer.subarray(at + batchOverhead, end)
  const batch: RecordBatch = {
    base,
    lastDelta,
    count: buffer.readInt32BE(at + 57),
    codec: attributes & 7,
    records,
  }
  const message = {
    offset: String(base + BigInt(lastDelta)),
    key: isControl ? controlKey(records) : null,
    value: null,
    headers: {},
    isControlRecord: isControl,
    batchContext: {
      isControlBatch: isControl,
      inTransaction: (attributes & transactionFlag) > 0,
      producerId: String(buffer.readBigInt64BE(at + 43)),
    },
    batch,
  }
  return { records: [message] }
}

/**
 * Offset of the first record that the broker sent of a fetched batch, those of aborted transactions included
 * (`messages` is without them); null when it sent none.
 */
export function firstOffset(batch: Library.Batch): bigint | null {
  const { rawMessages } = batch as Library.Batch & { readonly rawMessages?: readonly PackedMessage[] }
  const first = rawMessages?.[0]
  return first === undefined ? null : (first.batch?.base ?? BigInt(first.offset))
}

let loaded: typeof Library | null = null

/** The copy of kafkajs with the decoder replaced; loaded when it is first needed. */
export function kafkaLibrary(): typeof Library {
  if (loaded !== null) return loaded
  const path = require.resolve('kafkajs-feeds/src/protocol/recordBatch/v0/decoder.js')
  const original: unknown = require(path)
  const entry = require.cache[path]
  if (entry === undefined || typeof original !== 'function')
    throw new Error('kafkajs-feeds is not the version of kafkajs that this was written for')
  entry.exports = decodePacked
  loaded = require('kafkajs-feeds') as typeof Library
  return loaded
}
