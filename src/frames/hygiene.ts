import type { FindingKind } from '../reasons.ts'
import type { Levels } from './aligner.ts'
import { FindingBook, type FindingBookSnapshot } from './findings.ts'
import type { Finding } from './frame.ts'
import { lengthened } from './pending-steps.ts'
import { Stillness, type StillnessSnapshot } from './stillness.ts'

/** The condition of a signal: the worst of what is found about it. */
export const signalConditions = ['well', 'missing', 'stuck', 'stale', 'clipped'] as const
export type SignalCondition = (typeof signalConditions)[number]

export interface HygieneOptions {
  /** Milliseconds without movement after which a signal is stuck; null: learnt from its own history. */
  readonly stuckAfter: number | null
  /** Age in milliseconds beyond which a value is missing; null: it is so without a reading in the very row. */
  readonly staleAfter: number | null
  /** K of the truncation, in robust standard deviations; null where nothing is truncated. */
  readonly truncateAt: number | null
}

/** Rows without a reading before a signal is called stale, where no age is set. */
const staleRows = 12
/** Memory of the rates, in frames. */
const ratePull = 1 / 100
/** Memory of a signal's own history of being clipped, in frames. */
const slowPull = 1 / 5000
/** Share of a signal's readings that may come twice or out of order before it is said, and when it is over. */
const disorderAllowed = 0.2
const disorderOver = 0.1
/** A signal counts as clipped far too often beyond so many times what is expected, until it is back at that. */
const clippedFactor = 2

/** Columns by place. */
const columns = [
  'arrivals', // readings since the last closed step
  'twice', // of those, such that were there before
  'disordered', // of those, such that came after a later one
  'duplicates', // exponential means of the two shares
  'disorder',
  'silent', // frames in a row without a fresh value
  'clipped', // exponential mean share of clipped entries, short and long
  'clippedLong',
] as const
type Column = (typeof columns)[number]

/**
 * Data quality, signal by signal: each finding has an onset and an end, and a signal has at most one of a
 * kind open. A stuck signal is withheld from frames until it moves again.
 */
export class Hygiene {
  readonly #options: HygieneOptions
  readonly #nameOf: (place: number) => string
  readonly #stillness: Stillness
  readonly #book = new FindingBook()
  #places = 0
  /** End of the first step of this session. */
  #begun = 0
  #column = Object.fromEntries(columns.map((name) => [name, new Float64Array(0)])) as Record<
    Column,
    Float64Array
  >

  constructor(options: HygieneOptions, nameOf: (place: number) => string) {
    this.#options = options
    this.#nameOf = nameOf
    this.#stillness = new Stillness(options.stuckAfter)
  }

  /** 1 for each place whose value must not be used. Brought up to date by `levels`. */
  get withheld(): Uint8Array {
    return this.#stillness.stuck
  }

  /** Counts a reading of the signal at `place`; must be a place that `reserve` was told of. */
  arrived(place: number): void {
    this.#column.arrivals[place]!++
  }

  /** A reading that came twice. */
  duplicate(place: number): void {
    this.#column.twice[place]!++
  }

  /** A reading that came after a later one, or too late. */
  outOfOrder(place: number): void {
    this.#column.disordered[place]!++
  }

  /** There are now so many places. */
  reserve(places: number): void {
    if (this.#places >= places) return
    this.#places = places
    for (const name of columns) this.#column[name] = lengthened(this.#column[name], places, 0)
    this.#book.reserve(places)
  }

  /** Looks at the levels of a step before they are used. */
  levels(levels: Levels): void {
    const { places, time, fresh, follows } = levels
    this.reserve(places)
    if (follows === 'in-another-session') this.#begun = time
    this.#stillness.look(levels)
    const { stuck } = this.#stillness
    for (let place = 0; place < places; place++) {
      if ((stuck[place] === 1) !== this.#book.isOpen('stuck', place)) this.#turnStuck(levels, place)
      if (fresh[place] === 1) {
        this.#column.silent[place] = 0
        if (this.#book.isOpen('stale', place)) this.#book.end('stale', place, time)
      } else this.#silent(levels, place)
      if (this.#column.arrivals[place]! > 0) this.#countDisorder(place, time)
    }
  }

  /** Which places are present in a frame, and which of their entries were clipped (both 1 or 0 by place). */
  clipped(present: Uint8Array, clipped: Uint8Array, time: number): void {
    const K = this.#options.truncateAt
    if (K === null) return
    const { clipped: share, clippedLong: history } = this.#column
    const bound = 1 / (K * K)
    for (let place = 0; place < present.length; place++) {
      if (present[place] === 0) continue
      share[place] = share[place]! + ratePull * (clipped[place]! - share[place]!)
      const allowed = Math.max(bound, 2 * history[place]!)
      const open = this.#book.isOpen('clipped', place)
      if (!open) {
        history[place] = history[place]! + slowPull * (clipped[place]! - history[place]!)
        if (share[place]! > clippedFactor * allowed)
          this.#begin(
            'clipped',
            place,
            time,
            `beyond ±${K} far more often than 1/K² of the time and than before`,
          )
      } else if (share[place]! < allowed) this.#book.end('clipped', place, time)
    }
  }

  /** The ensemble as a whole was silent from one time to another. */
  gap(from: number, to: number): void {
    this.#book.tell({ signal: null, finding: 'gap', from, to, detail: 'no signal had a value' })
  }

  /** How many of the first `places` signals are in which condition; `missing`: never seen. */
  conditions(places: number): Record<SignalCondition, number> {
    const counts: Record<SignalCondition, number> = { well: 0, missing: 0, stuck: 0, stale: 0, clipped: 0 }
    for (let place = 0; place < places; place++) counts[this.#conditionOf(place)]++
    return counts
  }

  /** Findings that began or ended since the last call. */
  news(): readonly Finding[] {
    return this.#book.news()
  }

  #conditionOf(place: number): SignalCondition {
    if (place >= this.#places || !this.#stillness.seen(place)) return 'missing'
    if (this.#book.isOpen('stuck', place)) return 'stuck'
    if (this.#book.isOpen('stale', place)) return 'stale'
    return this.#book.isOpen('clipped', place) ? 'clipped' : 'well'
  }

  #begin(finding: FindingKind, place: number, from: number, detail: string): void {
    this.#book.begin(place, { signal: this.#nameOf(place), finding, from, to: null, detail })
  }

  #turnStuck({ value, time }: Levels, place: number): void {
    if (this.#book.isOpen('stuck', place)) this.#book.end('stuck', place, time)
    else this.#begin('stuck', place, this.#stillness.since(place), `repeats the value ${value[place]}`)
  }

  /** A frame without a fresh value. Time counts from the last reading, or from the beginning of the session. */
  #silent({ time, valueTime, follows }: Levels, place: number): void {
    const { silent } = this.#column
    silent[place] = follows === 'in-another-session' ? 1 : silent[place]! + 1
    if (this.#book.isOpen('stale', place)) return
    const { staleAfter } = this.#options
    const from = Number.isFinite(valueTime[place]!) ? valueTime[place]! : this.#begun
    if (staleAfter === null ? silent[place]! >= staleRows : time - from >= staleAfter)
      this.#begin('stale', place, from, 'no reading that is young enough')
  }

  #countDisorder(place: number, time: number): void {
    const { arrivals, twice, disordered, duplicates, disorder } = this.#column
    const count = arrivals[place]!
    duplicates[place] =
      duplicates[place]! + ratePull * (Math.min(1, twice[place]! / count) - duplicates[place]!)
    disorder[place] =
      disorder[place]! + ratePull * (Math.min(1, disordered[place]! / count) - disorder[place]!)
    arrivals[place] = 0
    twice[place] = 0
    disordered[place] = 0
    this.#turnOnShare('duplicate', place, duplicates[place]!, time, 'many readings come twice')
    this.#turnOnShare('out-of-order', place, disorder[place]!, time, 'many readings come after later ones')
  }

  #turnOnShare(finding: FindingKind, place: number, share: number, time: number, detail: string): void {
    if (!this.#book.isOpen(finding, place)) {
      if (share > disorderAllowed) this.#begin(finding, place, time, detail)
    } else if (share < disorderOver) this.#book.end(finding, place, time)
  }

  snapshot(): HygieneSnapshot {
    return {
      places: this.#places,
      begun: this.#begun,
      columns: columns.map((name) => this.#column[name].slice()),
      stillness: this.#stillness.snapshot(),
      book: this.#book.snapshot(),
    }
  }

  restore(s: HygieneSnapshot): void {
    this.#places = s.places
    this.#begun = s.begun
    for (const [c, name] of columns.entries()) this.#column[name] = s.columns[c]!.slice()
    this.#stillness.restore(s.stillness)
    this.#book.restore(s.book)
  }
}

export interface HygieneSnapshot {
  readonly places: number
  readonly begun: number
  readonly columns: readonly Float64Array[]
  readonly stillness: StillnessSnapshot
  readonly book: FindingBookSnapshot
}
