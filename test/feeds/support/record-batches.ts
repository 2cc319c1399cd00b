import { createRequire } from 'node:module'
import { kafkaLibrary, type PackedMessage } from '../../../src/feeds/kafka-library.ts'

// The encoder of kafkajs, and the decoder that src/feeds/kafka-library.ts put in place of its own.
const require = createRequire(import.meta.url)
kafkaLibrary()
const { RecordBatch } = require('kafkajs/src/protocol/recordBatch/v0/index.js')
const Record = require('kafkajs/src/protocol/recordBatch/record/v0/index.js')
const Long = require('kafkajs/src/utils/long.js')
const Decoder = require('kafkajs-feeds/src/protocol/decoder.js')
const decodePacked = require('kafkajs-feeds/src/protocol/recordBatch/v0/decoder.js')

/** A record batch as kafkajs's own producer writes it; `compression` 0 or 1 (gzip). */
export async function recordBatch(
  base: number,
  values: readonly (string | null)[],
  compression = 0,
): Promise<Buffer> {
  const records = values.map((value, i) =>
    Record({
      offsetDelta: i,
      timestampDelta: 1000 * i,
      key: i % 2 === 0 ? null : Buffer.from('key'),
      value: value === null ? null : Buffer.from(value),
      headers: i % 3 === 0 ? {} : { note: 'x' },
    }),
  )
  const firstOffset = Long.fromValue(String(base))
  const lastOffsetDelta = values.length - 1
  const encoded = await RecordBatch({ compression, firstOffset, lastOffsetDelta, records })
  return Buffer.from(encoded.buffer)
}

/** What the feeds' own decoder makes of fetched bytes. */
export async function unpack(...batches: readonly Buffer[]): Promise<PackedMessage[]> {
  const decoder = new Decoder(Buffer.concat(batches))
  const messages: PackedMessage[] = []
  for (const _ of batches) messages.push(...(await decodePacked(decoder)).records)
  return messages
}
