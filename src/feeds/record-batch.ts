import { failed, ok, type Result } from '../errors.ts'
import { decompress } from './decompress.ts'

/** A Kafka record batch as it came: its records are still packed, and compressed. */
export interface RecordBatch {
  /** Offset of the first record. */
  readonly base: bigint
  /** Offset of the last record less `base`; kept by the broker also when records were compacted away. */
  readonly lastDelta: number
  readonly count: number
  /** 0 none, 1 gzip, 2 Snappy, 3 LZ4, 4 zstd. */
  readonly codec: number
  readonly records: Buffer
}

/** Bytes of a record batch before its records (Kafka protocol guide, message format 2). */
export const batchOverhead = 61

/** Position of a signed LEB128 varint's end; its zigzag value is in `varint`. */
let varint = 0
function readVarint(bytes: Buffer, at: number): number {
  let p = at
  let value = 0
  let scale = 1
  for (let i = 0; i < 10; i++) {
    const byte = bytes[p++]
    if (byte === undefined) return -1
    value += (byte & 127) * scale
    if (byte < 128) {
      varint = value % 2 === 0 ? value / 2 : -(value + 1) / 2
      return p
    }
    scale *= 128
  }
  return -1
}

/** Walks the records of one batch, oldest first, without making an object of each. */
export class RecordWalk {
  /** Offset of the record in hand less the batch's base. */
  delta = -1
  /** The record's value is `bytes[from, to)`; `to` is -1 when it is null. At `bytes[to]` stands more of the record. */
  from = 0
  to = 0
  readonly bytes: Buffer
  #left: number
  #next = 0

  private constructor(bytes: Buffer, count: number) {
    this.bytes = bytes
    this.#left = count
  }

  /** The failure is what is wrong with the compressed data. */
  static of(batch: RecordBatch): Result<RecordWalk, string> {
    const records = decompress(batch.codec, batch.records)
    return records.ok ? ok(new RecordWalk(records.value, batch.count)) : failed(records.error)
  }

  /** Records not yet walked. */
  get left(): number {
    return this.#left
  }

  /** Goes to the next record; false at the end, or where the batch is damaged (`left` is then above 0). */
  next(): boolean {
    if (this.#left <= 0) return false
    const { bytes } = this
    let p = readVarint(bytes, this.#next)
    if (p < 0 || varint <= 0) return false
    const end = p + varint
    if (end > bytes.length) return false
    p = readVarint(bytes, p + 1)
    if (p < 0) return false
    p = readVarint(bytes, p)
    if (p < 0) return false
    const delta = varint
    p = readVarint(bytes, p)
    if (p < 0) return false
    if (varint > 0) p += varint
    p = readVarint(bytes, p)
    if (p < 0 || p + Math.max(0, varint) >= end) return false
    this.delta = delta
    this.from = p
    this.to = varint < 0 ? -1 : p + varint
    this.#next = end
    this.#left--
    return true
  }
}
