import type { BatchBuilder } from './batch-builder.ts'
import type { PackedMessage } from './kafka-library.ts'
import { type RecordBatch, RecordWalk } from './record-batch.ts'
import type { RecordReader } from './record-reader.ts'

/** Something fetched: a record batch, or one message of the formats before it. */
type Fetched = { readonly batch: RecordBatch } | { readonly offset: bigint; readonly value: Buffer | null }

/** What an entry of the queue costs beside its bytes, roughly. */
const overhead = 100

/**
 * One partition: what was fetched and is not yet given out. Holds the bytes as they came; record batches are
 * unpacked one at a time. Every offset is given out once, whatever is fetched again.
 */
export class PartitionLane {
  readonly source: string
  readonly partition: number
  readonly out: BatchBuilder
  /** Offset of the next record to be given out. */
  next: bigint
  /** Offset of the next record to be fetched. */
  fetched: bigint
  /** Offset of the record that will come last + 1, as the broker last told. */
  end: bigint
  /** Bytes in the queue. */
  bytes = 0
  held = false
  /** The client was asked to fetch no more for now. */
  paused = false
  /** A batch is being given out. */
  busy = false
  caughtUp = false
  /** The group says where the next fetch begins: another member may have read on meanwhile. */
  elsewhere = false
  /** A gap was told since it was last caught up; a compacted topic has one after another. */
  gapTold = false
  readonly #reader: RecordReader
  readonly #queue: Fetched[] = []
  #walk: { readonly walk: RecordWalk; readonly batch: RecordBatch } | null = null

  constructor(
    source: string,
    partition: number,
    start: { readonly next: bigint; readonly end: bigint },
    out: BatchBuilder,
    reader: RecordReader,
  ) {
    this.source = source
    this.partition = partition
    this.next = start.next
    this.fetched = start.next
    this.end = start.end
    this.out = out
    this.#reader = reader
  }

  get isEmpty(): boolean {
    return this.#queue.length === 0 && this.#walk === null
  }

  get behind(): number {
    return this.end > this.next ? Number(this.end - this.next) : 0
  }

  /** Takes in what one fetch brought; `upTo`: the offset after all of it. */
  take(messages: readonly PackedMessage[], upTo: bigint): void {
    for (const { offset, value, batch } of messages) {
      if (BigInt(offset) < this.fetched) continue
      if (batch === undefined) this.#put({ offset: BigInt(offset), value: value && Buffer.from(value) })
      else this.#put({ batch: { ...batch, records: Buffer.from(batch.records) } })
    }
    this.passTo(upTo)
  }

  /** All before `offset` was fetched, and what of it was not taken in holds no readings. */
  passTo(offset: bigint): void {
    if (offset > this.fetched) this.fetched = offset
    if (this.isEmpty && !this.busy) this.next = this.fetched
  }

  /** Gives up what is in the queue and goes on at `offset`. */
  restartAt(offset: bigint): void {
    this.clear()
    this.next = offset
    this.fetched = offset
  }

  /** Gives up what is in the queue; it will have to be fetched again. */
  clear(): void {
    this.#queue.length = 0
    this.#walk = null
    this.bytes = 0
    this.fetched = this.next
  }

  /** Reads from the queue into `out` until the batch is full or the queue empty. */
  fill(): void {
    const { out } = this
    while (!out.full) {
      if (this.#walk !== null) this.#goOn(this.#walk.walk, this.#walk.batch)
      else {
        const fetched = this.#queue.shift()
        if (fetched === undefined) break
        this.bytes -= costOf(fetched)
        if ('batch' in fetched) this.#open(fetched.batch)
        else this.#message(fetched.offset, fetched.value)
      }
    }
    if (this.isEmpty) this.next = this.fetched
  }

  #put(fetched: Fetched): void {
    this.#queue.push(fetched)
    this.bytes += costOf(fetched)
  }

  #open(batch: RecordBatch): void {
    const opened = RecordWalk.of(batch)
    if (opened.ok) this.#walk = { walk: opened.value, batch }
    else {
      this.#refuseRest('bad-compression', opened.error, batch, batch.count)
      this.#leave(batch)
    }
  }

  #goOn(walk: RecordWalk, batch: RecordBatch): void {
    const { out } = this
    const known = Number(this.next - batch.base)
    out.position = () => String(batch.base + BigInt(walk.delta))
    while (!out.full) {
      if (!walk.next()) {
        if (walk.left > 0) this.#refuseRest('unreadable', 'a damaged record batch', batch, walk.left)
        this.#leave(batch)
        return
      }
      if (walk.delta < known) continue
      this.#value(walk.bytes, walk.from, walk.to)
      this.next = batch.base + BigInt(walk.delta) + 1n
    }
  }

  #leave(batch: RecordBatch): void {
    this.#walk = null
    const after = batch.base + BigInt(batch.lastDelta) + 1n
    if (after > this.next) this.next = after
  }

  #message(offset: bigint, value: Buffer | null): void {
    if (offset < this.next) return
    this.out.position = () => String(offset)
    const bytes = Buffer.concat([value ?? noBytes, lineEnd])
    this.#value(bytes, 0, value === null ? -1 : value.length)
    this.next = offset + 1n
  }

  /** Reads one value; the byte behind it is lent to the reader as the line feed that it needs. */
  #value(bytes: Buffer, from: number, to: number): void {
    if (to <= from) {
      this.out.nextRecord()
      const detail = to < 0 ? 'a message without a value' : 'an empty message'
      this.out.refuse('unreadable', detail, bytes, from, from)
      return
    }
    const behind = bytes[to]!
    bytes[to] = 10
    this.#reader.message(bytes, from, to, this.out)
    bytes[to] = behind
  }

  #refuseRest(
    reason: 'bad-compression' | 'unreadable',
    detail: string,
    batch: RecordBatch,
    records: number,
  ): void {
    const { out } = this
    out.position = () => String(batch.base)
    out.nextRecord()
    out.refuse(reason, detail, batch.records, 0, batch.records.length)
    const more = Math.min(records, batch.lastDelta + 1) - 1
    if (more > 0) out.dropped[reason] = (out.dropped[reason] ?? 0) + more
  }
}

const costOf = (fetched: Fetched): number =>
  overhead + ('batch' in fetched ? fetched.batch.records.length : (fetched.value?.length ?? 0))

const noBytes = Buffer.alloc(0)
const lineEnd = Buffer.from([10])
