import { type FindingKind, findingKinds } from '../reasons.ts'
import type { Levels } from './aligner.ts'
import type { Finding } from './frame.ts'

/** The condition of a signal: the worst of what is found about it. */
export const signalConditions = ['well', 'missing', 'stuck', 'stale', 'clipped'] as const
export type SignalCondition = (typeof signalConditions)[number]

export interface HygieneOptions {
  /** Milliseconds without movement after which a signal is stuck; null: learnt from its own history. */
  readonly stuckAfter: number | null
  /** K of the truncation, in robust standard deviations; null where nothing is truncated. */
  readonly truncateAt: number | null
}

/** Unmoved frames that are never too many. */
const unmovedAllowed = 60
/** And so many times the longest earlier spell. */
const unmovedFactor = 8
/** Frames of its own history that a signal must have before it can be called stuck. */
const historyWanted = 60
/** Memory of the rates, in frames or readings. */
const ratePull = 1 / 100
const slowPull = 1 / 5000
/** Share of a signal's readings that may come twice or out of order before it is said. */
const disorderAllowed = 0.2

/** What is known of one signal, by place. */
interface Watched {
  /** The kinds of its open findings, one bit each in the order of `findingKinds`. */
  open: number
  /** Readings of the open step that came twice, and out of order. */
  twice: number
  disordered: number
  value: number
  seen: boolean
  frames: number
  unmoved: number
  unmovedSince: number
  longest: number
  duplicates: number
  disorder: number
  clipped: number
  clippedLong: number
}

/**
 * Data quality, signal by signal: each finding has an onset and an end, and a signal has at most one of a
 * kind open. A stuck signal is withheld from frames until it moves again.
 */
export class Hygiene {
  readonly #options: HygieneOptions
  readonly #nameOf: (place: number) => string
  #signals: Watched[] = []
  #withheld = new Uint8Array(0)
  #open = new Map<number, Finding>()
  #news: Finding[] = []

  constructor(options: HygieneOptions, nameOf: (place: number) => string) {
    this.#options = options
    this.#nameOf = nameOf
  }

  /** 1 for each place whose value must not be used. Brought up to date by `levels`. */
  get withheld(): Uint8Array {
    return this.#withheld
  }

  /** A reading that came twice. */
  duplicate(place: number): void {
    this.#signal(place).twice++
  }

  /** A reading that came after a later one. */
  outOfOrder(place: number): void {
    this.#signal(place).disordered++
  }

  /** Looks at the levels of a step before they are used; `arrivals` counts the step's readings by place. */
  levels(levels: Levels, arrivals: Float64Array): void {
    const { places, time } = levels
    if (places > 0) this.#signal(places - 1)
    if (this.#withheld.length < places) {
      const wider = new Uint8Array(places)
      wider.set(this.#withheld)
      this.#withheld = wider
    }
    for (let place = 0; place < places; place++) {
      const signal = this.#signals[place]!
      const fresh = levels.fresh[place] === 1
      if (arrivals[place]! > 0) countDisorder(signal, arrivals[place]!)
      this.#withheld[place] = this.#moves(signal, fresh, levels.value[place]!, time, place) ? 0 : 1
      const last = levels.valueTime[place]!
      this.#say(
        'stale',
        place,
        !fresh,
        Number.isFinite(last) ? last : time,
        time,
        'no reading that is young enough',
      )
      this.#say(
        'duplicate',
        place,
        signal.duplicates > disorderAllowed,
        time,
        time,
        'many readings come twice',
      )
      this.#say(
        'out-of-order',
        place,
        signal.disorder > disorderAllowed,
        time,
        time,
        'many readings come after later ones',
      )
    }
  }

  /** Which places were clipped in a frame, of those present. */
  clipped(places: Iterable<number>, present: Iterable<number>, time: number): void {
    const K = this.#options.truncateAt
    if (K === null) return
    const hit = new Set(places)
    for (const place of present) {
      const signal = this.#signal(place)
      const now = hit.has(place) ? 1 : 0
      signal.clipped += ratePull * (now - signal.clipped)
      const allowed = Math.max(1 / (K * K), 4 * signal.clippedLong)
      const key = keyOf('clipped', place)
      const limit = this.#open.has(key) ? allowed / 2 : 1.5 * allowed
      const detail = 'clipped far more often than 1/K² of the time (Chebyshev) and than before'
      this.#say('clipped', place, signal.clipped > limit, time, time, detail)
      if (!this.#open.has(key)) signal.clippedLong += slowPull * (now - signal.clippedLong)
    }
  }

  /** The ensemble as a whole was silent from one time to another. */
  gap(from: number, to: number): void {
    this.#news.push({ signal: null, finding: 'gap', from, to, detail: 'no signal had a value' })
  }

  /** How many of the first `places` signals are in which condition; `missing`: never seen. */
  conditions(places: number): Record<SignalCondition, number> {
    const counts: Record<SignalCondition, number> = { well: 0, missing: 0, stuck: 0, stale: 0, clipped: 0 }
    for (let place = 0; place < places; place++) {
      const has = (finding: FindingKind): boolean => this.#open.has(keyOf(finding, place))
      if (has('stuck')) counts.stuck++
      else if (!(this.#signals[place]?.seen ?? false)) counts.missing++
      else if (has('stale')) counts.stale++
      else if (has('clipped')) counts.clipped++
      else counts.well++
    }
    return counts
  }

  /** Findings that began or ended since the last call. */
  news(): readonly Finding[] {
    if (this.#news.length === 0) return nothing
    const news = this.#news
    this.#news = []
    return news
  }

  /** False for a signal that is stuck. */
  #moves(signal: Watched, fresh: boolean, value: number, time: number, place: number): boolean {
    if (fresh) {
      signal.frames++
      if (!signal.seen || value !== signal.value) {
        if (signal.seen && (signal.open & stuckBit) === 0) {
          signal.longest = Math.max(signal.longest, signal.unmoved)
        }
        signal.value = value
        signal.seen = true
        signal.unmoved = 0
        signal.unmovedSince = time
      } else signal.unmoved++
    }
    const { stuckAfter } = this.#options
    const allowed = Math.max(unmovedAllowed, unmovedFactor * signal.longest)
    const learnt = signal.frames - signal.unmoved >= historyWanted && signal.unmoved > allowed
    const stuck = fresh && (stuckAfter === null ? learnt : time - signal.unmovedSince > stuckAfter)
    const keeps = !fresh && (signal.open & stuckBit) !== 0
    if (stuck || keeps || (signal.open & stuckBit) !== 0) {
      this.#say(
        'stuck',
        place,
        stuck || keeps,
        signal.unmovedSince,
        time,
        `repeats the value ${signal.value}`,
      )
    }
    return !stuck
  }

  #say(finding: FindingKind, place: number, on: boolean, from: number, time: number, detail: string): void {
    const signal = this.#signals[place]!
    const bit = 1 << findingKinds.indexOf(finding)
    if (on === ((signal.open & bit) !== 0)) return
    signal.open ^= bit
    const key = keyOf(finding, place)
    const open = this.#open.get(key)
    if (open === undefined) {
      const begun: Finding = { signal: this.#nameOf(place), finding, from, to: null, detail }
      this.#open.set(key, begun)
      this.#news.push(begun)
    } else {
      this.#open.delete(key)
      this.#news.push({ ...open, to: time })
    }
  }

  #signal(place: number): Watched {
    while (this.#signals.length <= place) {
      this.#signals.push({
        open: 0,
        twice: 0,
        disordered: 0,
        value: 0,
        seen: false,
        frames: 0,
        unmoved: 0,
        unmovedSince: 0,
        longest: 0,
        duplicates: 0,
        disorder: 0,
        clipped: 0,
        clippedLong: 0,
      })
    }
    return this.#signals[place]!
  }

  snapshot(): HygieneSnapshot {
    return {
      signals: structuredClone(this.#signals),
      withheld: this.#withheld.slice(),
      open: structuredClone([...this.#open]),
      news: structuredClone(this.#news),
    }
  }

  restore(s: HygieneSnapshot): void {
    this.#signals = structuredClone(s.signals) as Watched[]
    this.#withheld = s.withheld.slice()
    this.#open = new Map(structuredClone(s.open))
    this.#news = structuredClone(s.news) as Finding[]
  }
}

const nothing: readonly Finding[] = []
const stuckBit = 1 << findingKinds.indexOf('stuck')
const keyOf = (finding: FindingKind, place: number): number => place * 8 + findingKinds.indexOf(finding)

function countDisorder(signal: Watched, arrivals: number): void {
  signal.duplicates += ratePull * (Math.min(1, signal.twice / arrivals) - signal.duplicates)
  signal.disorder += ratePull * (Math.min(1, signal.disordered / arrivals) - signal.disorder)
  signal.twice = 0
  signal.disordered = 0
}

export interface HygieneSnapshot {
  readonly signals: readonly Readonly<Watched>[]
  readonly withheld: Uint8Array
  readonly open: readonly (readonly [number, Finding])[]
  readonly news: readonly Finding[]
}
