import type { DropCounts, DropReason } from '../reasons.ts'
import { firstBytes } from './escape.ts'
import type { QuarantinedRecord, ReadingBatch } from './feed.ts'
import { badName, type NameTable } from './name-table.ts'

/** Readings after which a batch is full. */
export const batchSize = 16_384
/** Records that one batch puts in quarantine at most; the counts are complete all the same. */
const mostQuarantined = 50

/** Collects what the readers find: readings as columns, drops, records in quarantine. Reused batch by batch. */
export class BatchBuilder {
  readonly names: NameTable
  readonly #feed: string
  readonly #now: () => number
  /** Topic and partition, file name, or `stdin`. */
  source: string
  /** The line of the record in hand, from 1; readers of lines keep it. */
  line = 1
  /** The place of the record in hand, for the quarantine. */
  position: () => string = () => String(this.line)

  /** The batch has what it may hold: readers stop after the record in hand. */
  full = false
  count = 0
  signal: Int32Array
  time: Float64Array
  value: Float64Array
  dropped: DropCounts = {}
  quarantined: QuarantinedRecord[] = []
  /** Something was dropped since the last `reset`. */
  soiled = false
  /** A record's troubles are kept once; set false by `nextRecord`. */
  #kept = false
  readonly #size: number

  constructor(feed: string, source: string, names: NameTable, now: () => number, size = batchSize) {
    this.#feed = feed
    this.source = source
    this.names = names
    this.#now = now
    this.#size = size
    this.full = size === 0
    this.signal = new Int32Array(1024)
    this.time = new Float64Array(1024)
    this.value = new Float64Array(1024)
  }

  get empty(): boolean {
    return this.count === 0 && !this.soiled
  }

  /** Milliseconds since 1970, for times that a record states relative to now. */
  now(): number {
    return this.#now()
  }

  add(signal: number, time: number, value: number): void {
    const count = this.count
    if (count === this.time.length) this.#grow()
    this.signal[count] = signal
    this.time[count] = time
    this.value[count] = value
    this.count = count + 1
    if (count + 1 >= this.#size) this.full = true
  }

  /** To be called before each record that may be refused. */
  nextRecord(): void {
    this.#kept = false
  }

  /** Counts a drop and keeps the record that stands in `bytes[from, to)`. */
  refuse(reason: DropReason, detail: string, bytes: Uint8Array, from: number, to: number): void {
    this.dropped[reason] = (this.dropped[reason] ?? 0) + 1
    this.soiled = true
    if (this.#kept || this.quarantined.length >= mostQuarantined) return
    this.#kept = true
    this.quarantined.push({
      feed: this.#feed,
      source: this.source,
      position: this.position(),
      reason,
      detail,
      start: firstBytes(bytes, from, to),
      at: this.#now(),
    })
  }

  /** Counts what `NameTable.intern` did not take in. */
  refuseName(fate: number, bytes: Uint8Array, from: number, to: number): void {
    if (fate === badName)
      this.refuse('bad-signal', 'the signal name is no text of 1 to 200 plain characters', bytes, from, to)
    else this.refuse('too-many-signals', 'the feed has too many different signals', bytes, from, to)
  }

  /** What a `batch` event shows of it. */
  given(): { source: string; batch: ReadingBatch; quarantined: readonly QuarantinedRecord[] } {
    const { count, signal, time, value, dropped, source, quarantined } = this
    const batch = { count, names: this.names.names, signal, time, value, dropped }
    return { source, batch, quarantined }
  }

  reset(): void {
    this.count = 0
    this.full = false
    this.soiled = false
    this.dropped = {}
    this.quarantined = []
  }

  #grow(): void {
    const room = 2 * this.time.length
    const signal = new Int32Array(room)
    signal.set(this.signal)
    this.signal = signal
    const time = new Float64Array(room)
    time.set(this.time)
    this.time = time
    const value = new Float64Array(room)
    value.set(this.value)
    this.value = value
  }
}
