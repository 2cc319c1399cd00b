import type { DropCounts, DropReason } from '../reasons.ts'
import {
  Aligner,
  type AlignerSnapshot,
  type Fate,
  type Levels,
  late,
  outsideSessions,
  repeated,
  takenOutOfOrder,
  tooFarAhead,
} from './aligner.ts'
import { EppsCheck, type EppsSnapshot } from './epps.ts'
import type { Finding, Frame } from './frame.ts'
import { Hygiene, type HygieneSnapshot, type SignalCondition } from './hygiene.ts'
import { type Increment, type IncrementSnapshot, IncrementTaker } from './increments.ts'
import { Memory, type MemoryChoice, type MemorySnapshot } from './memory.ts'
import { overLimit, Roster, type RosterSnapshot, type SignalChoice, unwatched } from './roster.ts'
import { Scaler, type ScalerSnapshot } from './scaler.ts'
import { type SessionChoice, Sessions } from './sessions.ts'
import { type WatermarkSnapshot, Watermarks } from './watermarks.ts'

export interface FrameOptions {
  readonly signals: SignalChoice
  /** Milliseconds, or `row`. */
  readonly step: number | 'row'
  /** Milliseconds that a step stays open for readings that come late. */
  readonly lateness: number
  /** Milliseconds; null: 12 steps, with `row` the row itself. */
  readonly staleAfter: number | null
  /** Milliseconds of processing time. */
  readonly idleAfter: number
  /** Milliseconds that a reading may lie ahead of the present. */
  readonly ahead: number
  readonly sessions: SessionChoice | null
  readonly increment: Increment
  /** Steps of the exponential mean that `level` is taken from. */
  readonly levelSpan: number
  readonly memory: MemoryChoice
  /** Steps that an autoregression is fitted to. */
  readonly fitOver: number
  readonly commonVolatility: 'remove' | 'keep'
  /** Robust standard deviations; null: no truncation. */
  readonly truncateAt: number | null
  /** Frames that a signal's own scale rests on. */
  readonly scaleSpan: number
  /** Frames after which scales are fixed; null: they follow. */
  readonly scaleFixedAfter: number | null
  readonly stuckAfter: number | null
}

/** Readings as columns: see feeds/feed.ts. */
export interface Columns {
  readonly count: number
  readonly names: readonly string[]
  readonly signal: Int32Array
  readonly time: Float64Array
  readonly value: Float64Array
}

export interface Made {
  readonly frames: Frame[]
  readonly findings: readonly Finding[]
  readonly dropped: DropCounts
}

/** Entries of waiting steps that are kept at most, over all signals. */
const mostPendingEntries = 4_000_000
const mostPendingSteps = 100_000

/** Readings of one ensemble become its frames: alignment, increments, hygiene, memory, scale, truncation. */
export class FrameMaker {
  readonly #options: FrameOptions
  readonly #roster: Roster
  readonly #watermarks: Watermarks
  readonly #aligner: Aligner
  readonly #increments: IncrementTaker
  readonly #hygiene: Hygiene
  readonly #memory: Memory
  readonly #scaler: Scaler
  readonly #epps = new EppsCheck()
  /** For each list of names a feed shows: the places of its signals. */
  readonly #places = new WeakMap<readonly string[], number[]>()
  #arrivals: Float64Array = new Float64Array(0)
  #frames: Frame[] = []
  #next = 0
  #lastEnd = Number.NaN

  constructor(options: FrameOptions) {
    this.#options = options
    this.#roster = new Roster(options.signals)
    this.#watermarks = new Watermarks(options.idleAfter)
    const expected = 'names' in options.signals ? options.signals.names.length : options.signals.limit
    this.#aligner = new Aligner(
      {
        step: options.step,
        staleAfter: options.staleAfter,
        sessions: options.sessions === null ? null : new Sessions(options.sessions),
        mostPending: Math.max(64, Math.min(mostPendingSteps, Math.floor(mostPendingEntries / expected))),
      },
      this.#roster,
    )
    this.#increments = new IncrementTaker(options.increment, options.levelSpan)
    this.#hygiene = new Hygiene(options, (place) => this.#roster.nameOf(place))
    this.#memory = new Memory(options.memory, options.fitOver)
    this.#scaler = new Scaler({
      span: options.scaleSpan,
      fixedAfter: options.scaleFixedAfter,
      commonVolatility: options.commonVolatility,
      truncateAt: options.truncateAt,
    })
  }

  /** Names of the signals by index in frames. */
  get names(): readonly string[] {
    return this.#roster.names
  }

  watches(signal: string): boolean {
    return this.#roster.watches(signal)
  }

  /** T_eff/T: what the signals' own memory leaves of a window. */
  get effectiveShare(): number {
    return this.#memory.effectiveShare
  }

  get conditions(): Readonly<Record<SignalCondition, number>> {
    return this.#hygiene.conditions(this.#roster.places)
  }

  /** Steps that wait for the watermark. */
  get pending(): number {
    return this.#aligner.pending
  }

  /** A warning that the step is too short for the signals, or null. */
  get stepWarning(): string | null {
    return this.#epps.warning
  }

  /** Takes readings of one source in their order; `now` is the present by the clock of processing. */
  take(source: string, columns: Columns, now: number): Made {
    const { lateness, ahead, increment } = this.#options
    const { count, signal, time, value } = columns
    const from = this.#watermarks.source(source, now)
    from.spoke = now
    const places = this.#placesOf(columns.names)
    const latest = now + ahead
    const drops = new Drops()
    const log = increment === 'log-return'
    for (let r = 0; r < count; r++) {
      const id = signal[r]!
      let place = places[id]
      if (place === undefined) place = this.#place(places, id, columns.names[id]!)
      const t = time[r]!
      if (t > latest) {
        if (place !== unwatched) drops.add('ahead')
        continue
      }
      if (place >= 0) {
        if (log && !(value[r]! > 0)) drops.add('not-positive')
        else {
          const fate = this.#aligner.push(place, t, value[r]!)
          this.#arrivals[place]!++
          if (fate !== 0) this.#note(fate, place, drops)
        }
      } else if (place === overLimit) drops.add('too-many-signals')
      if (t > from.latest) {
        from.latest = t
        if (t - lateness >= this.#aligner.due) this.#close(now)
      }
    }
    return this.#made(drops.counts)
  }

  /** Sources that now belong to the ensemble's feeds; each holds the clock until it has spoken. */
  assign(sources: readonly string[], now: number): Made {
    for (const source of sources) this.#watermarks.source(source, now)
    return this.#made({})
  }

  revoke(sources: readonly string[], now: number): Made {
    for (const source of sources) this.#watermarks.remove(source)
    return this.beat(now)
  }

  caughtUp(source: string, now: number): Made {
    this.#watermarks.source(source, now).caughtUp = true
    return this.beat(now)
  }

  ended(source: string, now: number): Made {
    this.#watermarks.source(source, now).ended = true
    return this.beat(now)
  }

  /** Lets sources fall idle. */
  beat(now: number): Made {
    this.#close(now)
    return this.#made({})
  }

  /** Sources and the steps by which each runs ahead of the slowest one. */
  *leads(now: number): Generator<readonly [source: string, steps: number]> {
    const { step } = this.#options
    const perStep = step === 'row' ? Number.POSITIVE_INFINITY : step
    for (const [source, lead] of this.#watermarks.leads(now)) yield [source, lead / perStep]
  }

  #note(fate: Fate, place: number, drops: Drops): void {
    if (fate === takenOutOfOrder) this.#hygiene.outOfOrder(place)
    else if (fate === repeated) {
      this.#hygiene.duplicate(place)
      drops.add('duplicate')
    } else if (fate === late) drops.add('late')
    else if (fate === outsideSessions) drops.add('closed')
    else if (fate === tooFarAhead) drops.add('ahead')
  }

  #close(now: number): void {
    this.#aligner.close(this.#watermarks.reached(now) - this.#options.lateness, this.#closeStep)
  }

  #closeStep = (levels: Levels): void => {
    const { time, places } = levels
    if (levels.afresh && !Number.isNaN(this.#lastEnd) && this.#options.sessions === null) {
      const { step } = this.#options
      if (step !== 'row') this.#hygiene.gap(this.#lastEnd, time - step)
    }
    this.#lastEnd = time
    this.#hygiene.levels(levels, this.#arrivals)
    this.#arrivals.fill(0)
    const increments = this.#increments.take(levels, this.#hygiene.withheld)
    const fresh: number[] = []
    for (let place = 0; place < places; place++) {
      if (increments.has[place] === 1 && this.#roster.index(place) < 0) fresh.push(place)
    }
    if (fresh.length > 0) this.#roster.enrol(fresh)
    if (!increments.any) return
    const n = this.#roster.names.length
    const x = new Float64Array(n)
    const present = new Uint8Array(n)
    const placeOf = new Int32Array(n)
    for (let place = 0; place < places; place++) {
      const index = this.#roster.index(place)
      if (index < 0) continue
      placeOf[index] = place
      if (increments.has[place] === 0 || !Number.isFinite(increments.value[place]!)) continue
      x[index] = increments.value[place]!
      present[index] = 1
    }
    const raw = this.#memory.remembers ? x.slice() : x
    this.#memory.apply(x, present)
    const scaled = this.#scaler.scale(x, present)
    if (scaled === null) return
    const missing = n - scaled.present.reduce((sum, has) => sum + has, 0)
    if (missing === n) return
    if (!this.#scaler.plain) this.#epps.push(scaled.scaled)
    const presentPlaces: number[] = []
    for (let i = 0; i < n; i++) if (scaled.present[i] === 1) presentPlaces.push(placeOf[i]!)
    this.#hygiene.clipped(
      scaled.clippedSignals.map((i) => placeOf[i]!),
      presentPlaces,
      time,
    )
    this.#frames.push({
      index: this.#next++,
      time,
      present: scaled.present,
      missing,
      increments: raw,
      scaled: scaled.scaled,
      cleaned: scaled.cleaned,
      clipped: scaled.clipped,
      volatility: scaled.volatility,
    })
  }

  #made(dropped: DropCounts): Made {
    const frames = this.#frames
    if (frames.length > 0) this.#frames = []
    return { frames, findings: this.#hygiene.news(), dropped }
  }

  #placesOf(names: readonly string[]): number[] {
    const known = this.#places.get(names)
    if (known !== undefined) return known
    const places: number[] = []
    this.#places.set(names, places)
    return places
  }

  #place(places: number[], id: number, name: string): number {
    const place = this.#roster.place(name)
    places[id] = place
    if (place >= this.#arrivals.length) {
      const wider = new Float64Array(Math.max(16, 2 * place + 1, this.#roster.places))
      wider.set(this.#arrivals)
      this.#arrivals = wider
    }
    return place
  }

  snapshot(): FrameMakerSnapshot {
    return {
      roster: this.#roster.snapshot(),
      watermarks: this.#watermarks.snapshot(),
      aligner: this.#aligner.snapshot(),
      increments: this.#increments.snapshot(),
      hygiene: this.#hygiene.snapshot(),
      memory: this.#memory.snapshot(),
      scaler: this.#scaler.snapshot(),
      epps: this.#epps.snapshot(),
      arrivals: this.#arrivals.slice(),
      next: this.#next,
      lastEnd: this.#lastEnd,
    }
  }

  restore(snapshot: unknown): void {
    const s = snapshot as FrameMakerSnapshot
    this.#roster.restore(s.roster)
    this.#watermarks.restore(s.watermarks)
    this.#aligner.restore(s.aligner)
    this.#increments.restore(s.increments)
    this.#hygiene.restore(s.hygiene)
    this.#memory.restore(s.memory)
    this.#scaler.restore(s.scaler)
    this.#epps.restore(s.epps)
    this.#arrivals = s.arrivals.slice()
    this.#next = s.next
    this.#lastEnd = s.lastEnd
  }
}

export interface FrameMakerSnapshot {
  readonly roster: RosterSnapshot
  readonly watermarks: WatermarkSnapshot
  readonly aligner: AlignerSnapshot
  readonly increments: IncrementSnapshot
  readonly hygiene: HygieneSnapshot
  readonly memory: MemorySnapshot
  readonly scaler: ScalerSnapshot
  readonly epps: EppsSnapshot
  readonly arrivals: Float64Array
  readonly next: number
  readonly lastEnd: number
}

class Drops {
  counts: DropCounts = {}

  add(reason: DropReason): void {
    this.counts[reason] = (this.counts[reason] ?? 0) + 1
  }
}
