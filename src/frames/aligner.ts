import { lengthened, PendingSteps, type Step, type StepSnapshot } from './pending-steps.ts'
import type { Roster } from './roster.ts'
import type { Sessions } from './sessions.ts'

/** What became of one reading. */
export const taken = 0
export const late = 1
export const outsideSessions = 2
/** A reading of the same signal and time was there before; of the two the larger value counts. */
export const repeated = 3
export const tooFarAhead = 4
/** Taken, though a later reading of the signal had come before it. */
export const takenOutOfOrder = 5
export type Fate = 0 | 1 | 2 | 3 | 4 | 5

/** A value is fresh for so many steps where nothing else is set. */
const freshSteps = 12

export interface AlignerOptions {
  /** Length of a step in milliseconds; `row`: every distinct time stamp is a step. */
  readonly step: number | 'row'
  /** Age in milliseconds beyond which a value is missing; null: 12 steps, and with `row` only the row itself. */
  readonly staleAfter: number | null
  readonly sessions: Sessions | null
  /** Most steps that may wait at once, and most places over all of them; readings for further ones are refused. */
  readonly mostPendingSteps: number
  readonly mostPendingEntries: number
}

/** The levels at the end of one step; arrays by place, borrowed until the next call. */
export interface Levels {
  /** End of the step, milliseconds since 1970 UTC; with `row` the row's own time. */
  readonly time: number
  /** How the step follows on the one before: directly, after a silence in the same session, or in another. */
  readonly follows: 'directly' | 'after-silence' | 'in-another-session'
  /** Last values and their event times; -Infinity where there is none in this session. */
  readonly value: Float64Array
  readonly valueTime: Float64Array
  /** 1 where the value is younger than `staleAfter`. */
  readonly fresh: Uint8Array
  readonly places: number
}

/**
 * Previous-tick alignment onto the steps [k·step, (k+1)·step). Readings wait by step until the watermark has
 * passed its end; closing a step carries each signal's last value forward as long as it is fresh, and steps
 * in which nothing is fresh are jumped over. What comes out depends on the readings alone, not on their order
 * or batches: of two readings of one signal and time the larger value counts.
 */
export class Aligner {
  readonly #options: AlignerOptions
  readonly #roster: Roster
  readonly #staleAfter: number
  readonly #pending: PendingSteps
  /** The step that the last reading went to. */
  #step: Step | null = null
  /** Key of the last closed step; NaN before the first. */
  #closed = Number.NaN
  #session = Number.NaN
  #due = Number.POSITIVE_INFINITY
  #watermark = Number.NEGATIVE_INFINITY
  #value: Float64Array = new Float64Array(0)
  #valueTime: Float64Array = new Float64Array(0)
  #fresh = new Uint8Array(0)
  /** Latest of `valueTime`. */
  #newest = Number.NEGATIVE_INFINITY
  /** Latest time of a reading by place, waiting ones too. */
  #seen: Float64Array = new Float64Array(0)

  constructor(options: AlignerOptions, roster: Roster) {
    const { step, staleAfter, sessions, mostPendingSteps, mostPendingEntries } = options
    this.#options = options
    this.#roster = roster
    this.#staleAfter = staleAfter ?? (step === 'row' ? 0 : freshSteps * step)
    this.#pending = new PendingSteps(mostPendingSteps, mostPendingEntries, (key) => {
      if (step === 'row') return { from: key, until: key, inSession: true }
      const from = key * step
      const until = (key + 1) * step
      return { from, until, inSession: sessions === null || sessions.covers(from, until) }
    })
  }

  /** Steps that wait to be closed. */
  get pendingSteps(): number {
    return this.#pending.count
  }

  /** Readings that wait in them: at most one of a signal and step, its last. */
  get pendingReadings(): number {
    return this.#pending.readings
  }

  /** Where the first waiting step begins; +Infinity while none waits. */
  get pendingSince(): number {
    return this.#pending.first?.from ?? Number.POSITIVE_INFINITY
  }

  /** Waiting steps that begin after `from` and not after `until`. */
  pendingWithin(from: number, until: number): number {
    return this.#pending.countWithin(from, until)
  }

  /** The watermark from which on the next step can be closed; +Infinity while there is none. */
  get due(): number {
    return this.#due
  }

  /** Takes a reading of the signal at `place`. `time` in milliseconds, both finite. */
  push(place: number, time: number, value: number): Fate {
    const { step: length, sessions } = this.#options
    let step = this.#step
    const here =
      step !== null && (length === 'row' ? time === step.from : time >= step.from && time < step.until)
    if (!here || !step!.inSession) {
      const key = length === 'row' ? time : stepOf(time, length)
      if (this.#isPast(key)) return late
      if (sessions !== null && Number.isNaN(sessions.at(time))) return outsideSessions
      step = this.#pending.find(key) ?? this.#open(key)
      if (step === null) return tooFarAhead
      this.#step = step
    }
    if (place >= this.#seen.length) this.#seeMore()
    if (place >= step!.time.length) this.#pending.widen(step!, this.#roster.places)
    const before = step!.time[place]!
    if (time === before) {
      if (value > step!.value[place]!) step!.value[place] = value
      return repeated
    }
    if (time > before) {
      step!.time[place] = time
      step!.value[place] = value
    }
    if (time < this.#seen[place]!) return takenOutOfOrder
    this.#seen[place] = time
    return taken
  }

  /**
   * The watermark, finite, has come so far: closes, oldest first, every step whose end it has passed, and
   * shows each to `visit`. No reading of those is taken any more, whether anything had waited for them or not.
   */
  reach(watermark: number, visit: (levels: Levels) => void): void {
    if (watermark > this.#watermark) this.#watermark = watermark
    if (this.#watermark < this.#due) return
    for (let key = this.#next(); this.#isPast(key); key = this.#next()) this.#close(key, visit)
    this.#expect()
  }

  /** Closes all that waits, as though the watermark had passed it. */
  flush(visit: (levels: Levels) => void): void {
    while (this.#pending.count > 0) this.#close(this.#next(), visit)
    this.#expect()
  }

  /** Is the step closed, or would be had anything waited for it? */
  #isPast(key: number): boolean {
    if (key <= this.#closed) return true
    return this.#options.step === 'row' ? key < this.#watermark : this.#end(key) <= this.#watermark
  }

  #end(key: number): number {
    return this.#options.step === 'row' ? key : (key + 1) * this.#options.step
  }

  /**
   * The step to close next: the one after the last closed as long as a value would still be fresh there,
   * else the earliest for which readings wait; +Infinity where there is none.
   */
  #next(): number {
    const earliest = this.#pending.first?.key ?? Number.POSITIVE_INFINITY
    if (this.#options.step === 'row' || Number.isNaN(this.#closed)) return earliest
    const following = this.#closed + 1
    if (following >= earliest || this.#newest < this.#end(following) - this.#staleAfter) return earliest
    return this.#sessionOf(following) === this.#session ? following : earliest
  }

  #expect(): void {
    this.#due = this.#end(this.#next())
  }

  /** Opening instant of the step's session: at its last instant, else at its first; NaN in closed time. */
  #sessionOf(key: number): number {
    const { step, sessions } = this.#options
    if (sessions === null) return 0
    if (step === 'row') return sessions.at(key)
    const session = sessions.at((key + 1) * step - 1)
    return Number.isNaN(session) ? sessions.at(key * step) : session
  }

  #close(key: number, visit: (levels: Levels) => void): void {
    const end = this.#end(key)
    const places = this.#roster.places
    this.#reserve(places)
    const session = this.#sessionOf(key)
    const inAnother = session !== this.#session
    if (inAnother) {
      this.#valueTime.fill(Number.NEGATIVE_INFINITY)
      this.#newest = Number.NEGATIVE_INFINITY
    }
    const direct = this.#options.step === 'row' || key === this.#closed + 1
    if (this.#pending.first?.key === key) this.#merge(this.#pending.shift()!)
    const oldest = end - this.#staleAfter
    for (let i = 0; i < places; i++) this.#fresh[i] = this.#valueTime[i]! >= oldest ? 1 : 0
    this.#closed = key
    this.#session = session
    visit({
      time: end,
      follows: inAnother ? 'in-another-session' : direct ? 'directly' : 'after-silence',
      value: this.#value,
      valueTime: this.#valueTime,
      fresh: this.#fresh,
      places,
    })
  }

  #merge(step: Step): void {
    if (this.#step === step) this.#step = null
    for (let i = 0; i < step.time.length; i++) {
      const time = step.time[i]!
      if (time <= this.#valueTime[i]!) continue
      this.#valueTime[i] = time
      this.#value[i] = step.value[i]!
      if (time > this.#newest) this.#newest = time
    }
  }

  #open(key: number): Step | null {
    const step = this.#pending.open(key, this.#roster.places)
    this.#expect()
    return step
  }

  #seeMore(): void {
    this.#seen = lengthened(this.#seen, this.#roster.places, Number.NEGATIVE_INFINITY)
  }

  #reserve(places: number): void {
    if (this.#value.length >= places) return
    this.#value = lengthened(this.#value, places, 0)
    this.#valueTime = lengthened(this.#valueTime, places, Number.NEGATIVE_INFINITY)
    this.#fresh = new Uint8Array(places)
  }

  snapshot(): AlignerSnapshot {
    return {
      pending: this.#pending.snapshot(),
      closed: this.#closed,
      session: this.#session,
      watermark: this.#watermark,
      value: this.#value.slice(),
      valueTime: this.#valueTime.slice(),
      newest: this.#newest,
      seen: this.#seen.slice(),
    }
  }

  restore(s: AlignerSnapshot): void {
    this.#pending.restore(s.pending)
    this.#step = null
    this.#closed = s.closed
    this.#session = s.session
    this.#watermark = s.watermark
    this.#value = s.value.slice()
    this.#valueTime = s.valueTime.slice()
    this.#fresh = new Uint8Array(s.value.length)
    this.#newest = s.newest
    this.#seen = s.seen.slice()
    this.#expect()
  }
}

export interface AlignerSnapshot {
  readonly pending: readonly StepSnapshot[]
  readonly closed: number
  readonly session: number
  readonly watermark: number
  readonly value: Float64Array
  readonly valueTime: Float64Array
  readonly newest: number
  readonly seen: Float64Array
}

/** Number k of the step with k·length ≤ time < (k+1)·length, whatever the quotient was rounded to. */
function stepOf(time: number, length: number): number {
  const key = Math.floor(time / length)
  if (time < key * length) return key - 1
  return time >= (key + 1) * length ? key + 1 : key
}
