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
import type { EppsComparison } from './epps.ts'
import type { Frame } from './frame.ts'
import { FrameBuilder, type FrameBuilderSnapshot } from './frame-builder.ts'
import type { Columns, FrameOptions, Made } from './frame-options.ts'
import { Hygiene, type HygieneSnapshot, type SignalCondition } from './hygiene.ts'
import { overLimit, Roster, type RosterSnapshot, unwatched } from './roster.ts'
import { Sessions } from './sessions.ts'
import { type WatermarkSnapshot, Watermarks } from './watermarks.ts'

export type { Columns, FrameOptions, Made } from './frame-options.ts'

/** Event times outside of the years 1900 to 2200 are no event times. Milliseconds since 1970 UTC. */
const earliestTime = Date.UTC(1900, 0, 1)
const latestTime = Date.UTC(2201, 0, 1) - 1
/** Places in steps that wait, over all of them: 16 bytes each. And steps that wait, however few their places. */
const mostPendingEntries = 16_000_000
const mostPendingSteps = 100_000
/** Steps after which a value is missing, where no age is set. */
const freshSteps = 12
/** A name of a feed that was not looked at yet. */
const unknown = -3

/**
 * Readings of one ensemble become its frames. Steps close as the watermark of all sources passes their ends;
 * no call reads a clock: `now`, milliseconds since 1970 UTC, is the present of the caller.
 */
export class FrameMaker {
  readonly #options: FrameOptions
  readonly #roster: Roster
  readonly #watermarks: Watermarks
  readonly #aligner: Aligner
  readonly #hygiene: Hygiene
  readonly #builder: FrameBuilder
  /** For each list of names a feed shows: the places of its signals by the feed's number. */
  #places = new WeakMap<readonly string[], Int32Array>()
  #frames: Frame[] = []
  #lastEnd = Number.NaN

  constructor(options: FrameOptions) {
    this.#options = options
    const { step } = options
    const staleAfter = options.staleAfter ?? (step === 'row' ? null : freshSteps * step)
    this.#roster = new Roster(options.signals)
    this.#watermarks = new Watermarks(options.idleAfter)
    const sessions = options.sessions === null ? null : new Sessions(options.sessions)
    this.#aligner = new Aligner(
      { step, staleAfter, sessions, mostPendingSteps, mostPendingEntries },
      this.#roster,
    )
    this.#hygiene = new Hygiene({ ...options, staleAfter }, (place) => this.#roster.nameOf(place))
    this.#hygiene.reserve(this.#roster.places)
    this.#builder = new FrameBuilder(options, this.#roster, this.#hygiene)
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
    return this.#builder.effectiveShare
  }

  get conditions(): Readonly<Record<SignalCondition, number>> {
    return this.#hygiene.conditions(this.#roster.places)
  }

  /** Steps that wait for the watermark. */
  get pending(): number {
    return this.#aligner.pendingSteps
  }

  /** Readings that wait in them; counted when asked for. */
  get pendingReadings(): number {
    return this.#aligner.pendingReadings
  }

  /** Mean correlation at the step against that at a longer one; null while unknown. */
  get stepComparison(): EppsComparison | null {
    return this.#builder.comparison
  }

  /** A warning that the step is too short for the signals, or null. */
  get stepWarning(): string | null {
    return this.#builder.warning
  }

  /** Takes readings of one source in their order. */
  take(source: string, columns: Columns, now: number): Made {
    const { lateness, increment } = this.#options
    const { count, names, signal, time, value } = columns
    const from = this.#watermarks.source(source, now)
    from.spoke = now
    from.ended = false
    const others = this.#watermarks.reachedByOthers(from, now)
    const latest = Math.min(latestTime, now + this.#options.ahead)
    const log = increment === 'log-return'
    const drops = new Drops()
    let places = this.#placesOf(names)
    for (let r = 0; r < count; r++) {
      const id = signal[r]!
      if (id >= places.length) places = this.#widened(names)
      let place = places[id]!
      if (place === unknown) place = this.#place(places, id, names[id]!)
      const t = time[r]!
      if (!(t >= earliestTime && t <= latest)) {
        if (place !== unwatched) drops.add(t > latest && t <= latestTime ? 'ahead' : 'bad-time')
        continue
      }
      if (place >= 0) {
        const v = value[r]!
        this.#hygiene.arrived(place)
        if (!Number.isFinite(v)) drops.add('bad-value')
        else if (log && v <= 0) drops.add('not-positive')
        else {
          const fate = this.#aligner.push(place, t, v)
          if (fate !== 0) this.#note(fate, place, drops)
        }
      } else if (place === overLimit) drops.add('too-many-signals')
      if (t > from.latest) {
        from.latest = t
        this.#reach(Math.min(t, others) - lateness)
      }
    }
    return this.beat(now, drops.counts)
  }

  /** Sources that now belong to the ensemble's feeds; each holds the clock until it has spoken. */
  assign(sources: readonly string[], now: number): Made {
    for (const source of sources) this.#watermarks.assign(source, now)
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

  /** Lets time pass: sources may fall idle. `dropped` is handed on. */
  beat(now: number, dropped: DropCounts = {}): Made {
    const reached = this.#watermarks.reached(now)
    if (reached < Number.POSITIVE_INFINITY) this.#reach(reached - this.#options.lateness)
    else this.#closeAll()
    return this.#made(dropped)
  }

  /** Closes all that waits, as though every source had ended. */
  flush(): Made {
    this.#closeAll()
    return this.#made({})
  }

  /**
   * Sources, and the steps by which each runs ahead of what holds the clock: of the slowest source, or, while
   * one has not spoken, of the first waiting step. With `row` the rows that wait in between.
   */
  *leads(now: number): Generator<readonly [source: string, steps: number]> {
    const { step } = this.#options
    const since = this.#aligner.pendingSince
    const reached = this.#watermarks.reached(now)
    const floor = since < Number.POSITIVE_INFINITY ? Math.max(reached, since) : reached
    for (const [source, latest] of this.#watermarks.living()) {
      if (!(latest > floor) || since === Number.POSITIVE_INFINITY) yield [source, 0]
      else if (step === 'row') yield [source, this.#aligner.pendingWithin(floor, latest)]
      else yield [source, (latest - floor) / step]
    }
  }

  #note(fate: Fate, place: number, drops: Drops): void {
    if (fate === takenOutOfOrder) this.#hygiene.outOfOrder(place)
    else if (fate === late) {
      this.#hygiene.outOfOrder(place)
      drops.add('late')
    } else if (fate === repeated) {
      this.#hygiene.duplicate(place)
      drops.add('duplicate')
    } else if (fate === outsideSessions) drops.add('closed')
    else if (fate === tooFarAhead) drops.add('ahead')
  }

  #reach(watermark: number): void {
    this.#aligner.reach(watermark, this.#closeStep)
  }

  /** Steps as far as the furthest source came, and then the waiting ones: not dependent on who ended last. */
  #closeAll(): void {
    this.#reach(this.#watermarks.furthest - this.#options.lateness)
    this.#aligner.flush(this.#closeStep)
  }

  #closeStep = (levels: Levels): void => {
    const { step } = this.#options
    if (levels.follows === 'after-silence' && step !== 'row')
      this.#hygiene.gap(this.#lastEnd, levels.time - step)
    this.#lastEnd = levels.time
    this.#hygiene.levels(levels)
    const frame = this.#builder.build(levels)
    if (frame !== null) this.#frames.push(frame)
  }

  #made(dropped: DropCounts): Made {
    const frames = this.#frames
    if (frames.length > 0) this.#frames = []
    return { frames, findings: this.#hygiene.news(), dropped }
  }

  #placesOf(names: readonly string[]): Int32Array {
    return this.#places.get(names) ?? this.#widened(names)
  }

  #widened(names: readonly string[]): Int32Array {
    const known = this.#places.get(names)
    const wider = new Int32Array(Math.max(16, 2 * names.length)).fill(unknown)
    if (known !== undefined) wider.set(known)
    this.#places.set(names, wider)
    return wider
  }

  #place(places: Int32Array, id: number, name: string): number {
    const place = this.#roster.place(name)
    places[id] = place
    this.#hygiene.reserve(this.#roster.places)
    return place
  }

  snapshot(): FrameMakerSnapshot {
    return {
      roster: this.#roster.snapshot(),
      watermarks: this.#watermarks.snapshot(),
      aligner: this.#aligner.snapshot(),
      hygiene: this.#hygiene.snapshot(),
      builder: this.#builder.snapshot(),
      lastEnd: this.#lastEnd,
    }
  }

  restore(snapshot: unknown): void {
    const s = snapshot as FrameMakerSnapshot
    this.#places = new WeakMap()
    this.#roster.restore(s.roster)
    this.#watermarks.restore(s.watermarks)
    this.#aligner.restore(s.aligner)
    this.#hygiene.restore(s.hygiene)
    this.#builder.restore(s.builder)
    this.#lastEnd = s.lastEnd
  }
}

export interface FrameMakerSnapshot {
  readonly roster: RosterSnapshot
  readonly watermarks: WatermarkSnapshot
  readonly aligner: AlignerSnapshot
  readonly hygiene: HygieneSnapshot
  readonly builder: FrameBuilderSnapshot
  readonly lastEnd: number
}

class Drops {
  counts: DropCounts = {}

  add(reason: DropReason): void {
    this.counts[reason] = (this.counts[reason] ?? 0) + 1
  }
}
