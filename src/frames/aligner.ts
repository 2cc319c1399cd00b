import { KeyHeap } from './key-heap.ts'
import type { Roster } from './roster.ts'
import type { Sessions } from './sessions.ts'

/** The last readings of all places within one step that is still open; -Infinity where there is none. */
interface Slot {
  readonly key: number
  time: Float64Array
  value: Float64Array
}

/** What became of one reading. */
export const taken = 0
export const late = 1
export const outsideSessions = 2
export const repeated = 3
export const tooFarAhead = 4
/** Taken, though a later reading of the signal had come before it. */
export const takenOutOfOrder = 5
export type Fate = 0 | 1 | 2 | 3 | 4 | 5

export interface AlignerOptions {
  /** Length of a step in milliseconds; `row`: every distinct time stamp is a step. */
  readonly step: number | 'row'
  /** Age in milliseconds beyond which a value is missing; null: 12 steps, and with `row` only the row itself. */
  readonly staleAfter: number | null
  readonly sessions: Sessions | null
  /** Most steps that may wait at once; a reading for a further one is refused. */
  readonly mostPending: number
}

/** The levels at the end of one step; arrays by place, borrowed until the next call. */
export interface Levels {
  /** End of the step, milliseconds since 1970 UTC; with `row` the row's own time. */
  readonly time: number
  /** True where the step does not follow on the one before: a gap, or another session. */
  readonly afresh: boolean
  /** Last values and their event times; -Infinity where there never was one. */
  readonly value: Float64Array
  readonly valueTime: Float64Array
  /** 1 where the value is younger than `staleAfter`. */
  readonly fresh: Uint8Array
  readonly places: number
}

/**
 * Previous-tick alignment. Readings wait by step until the watermark has passed its end; closing a step
 * carries each signal's last value forward as long as it is fresh. What comes out depends on the readings
 * alone, not on their order or batches: of two readings of one signal and time the larger value counts.
 */
export class Aligner {
  readonly #options: AlignerOptions
  readonly #roster: Roster
  readonly #slots = new Map<number, Slot>()
  /** The keys of the slots. */
  readonly #waiting = new KeyHeap()
  #spare: Slot[] = []
  #slot: Slot | null = null
  /** Key of the last closed step; NaN before the first. */
  #closed = Number.NaN
  #session = -1
  #due = Number.POSITIVE_INFINITY
  #value: Float64Array = new Float64Array(0)
  #valueTime: Float64Array = new Float64Array(0)
  #fresh = new Uint8Array(0)

  constructor(options: AlignerOptions, roster: Roster) {
    this.#options = options
    this.#roster = roster
  }

  get pending(): number {
    return this.#slots.size
  }

  /** The watermark from which on the next step can be closed; +Infinity while nothing waits. */
  get due(): number {
    return this.#due
  }

  /** Takes a reading of the signal at `place`. `time` in milliseconds, `value` finite. */
  push(place: number, time: number, value: number): Fate {
    const { step, sessions } = this.#options
    const key = step === 'row' ? time : Math.floor(time / step)
    if (key <= this.#closed) return late
    if (sessions !== null && sessions.at(time) < 0) return outsideSessions
    let slot = this.#slot
    if (slot === null || slot.key !== key) {
      const found = this.#slots.get(key) ?? this.#open(key)
      if (found === null) return tooFarAhead
      slot = found
      this.#slot = found
    }
    if (place >= slot.time.length) this.#widen(slot)
    const before = slot.time[place]!
    if (time > before) {
      slot.time[place] = time
      slot.value[place] = value
      return taken
    }
    if (time === before) {
      if (value > slot.value[place]!) slot.value[place] = value
      return repeated
    }
    return takenOutOfOrder
  }

  /** Closes, oldest first, every step whose end the watermark has reached, and shows each to `visit`. */
  close(watermark: number, visit: (levels: Levels) => void): void {
    while (this.#slots.size > 0) {
      const key = this.#next()
      const end = this.#end(key)
      if (this.#options.step === 'row' ? watermark <= end : watermark < end) break
      this.#closeStep(key, end, visit)
    }
    this.#expect()
  }

  #expect(): void {
    this.#due = this.#slots.size === 0 ? Number.POSITIVE_INFINITY : this.#end(this.#next())
  }

  #end(key: number): number {
    return this.#options.step === 'row' ? key : (key + 1) * this.#options.step
  }

  /**
   * The step to close next: the one after the last closed as long as a value would still be fresh there,
   * else the earliest for which readings wait. Without a waiting reading nothing is due.
   */
  #next(): number {
    const earliest = this.#waiting.least
    const { step, sessions } = this.#options
    if (step === 'row' || Number.isNaN(this.#closed)) return earliest
    const following = this.#closed + 1
    if (following >= earliest) return earliest
    const end = this.#end(following)
    if (!this.#anyFresh(end)) return earliest
    if (sessions !== null && sessions.at(end - 1) < 0) return earliest
    return following
  }

  #anyFresh(end: number): boolean {
    const oldest = end - this.#staleAfter()
    for (let i = 0; i < this.#valueTime.length; i++) if (this.#valueTime[i]! >= oldest) return true
    return false
  }

  #staleAfter(): number {
    const { step, staleAfter } = this.#options
    return staleAfter ?? (step === 'row' ? 0 : 12 * step)
  }

  #closeStep(key: number, end: number, visit: (levels: Levels) => void): void {
    const { step, sessions } = this.#options
    const places = this.#roster.places
    this.#reserve(places)
    const session = sessions === null ? 0 : sessions.at(step === 'row' ? end : end - 1)
    const otherSession = session !== this.#session
    if (otherSession) this.#valueTime.fill(Number.NEGATIVE_INFINITY)
    const afresh = otherSession || (step !== 'row' && key !== this.#closed + 1)
    const slot = this.#slots.get(key)
    if (slot !== undefined) {
      for (let i = 0; i < slot.time.length; i++) {
        if (slot.time[i]! > this.#valueTime[i]!) {
          this.#valueTime[i] = slot.time[i]!
          this.#value[i] = slot.value[i]!
        }
      }
      this.#recycle(slot)
    }
    const oldest = end - this.#staleAfter()
    for (let i = 0; i < places; i++) this.#fresh[i] = this.#valueTime[i]! >= oldest ? 1 : 0
    this.#closed = key
    this.#session = session
    visit({ time: end, afresh, value: this.#value, valueTime: this.#valueTime, fresh: this.#fresh, places })
  }

  #open(key: number): Slot | null {
    if (this.#slots.size >= this.#options.mostPending) return null
    const recycled = this.#spare.pop()
    const slot: Slot = {
      key,
      time: recycled?.time.fill(Number.NEGATIVE_INFINITY) ?? new Float64Array(0),
      value: recycled?.value ?? new Float64Array(0),
    }
    this.#slots.set(key, slot)
    this.#waiting.push(key)
    this.#expect()
    return slot
  }

  #recycle(slot: Slot): void {
    this.#slots.delete(slot.key)
    this.#waiting.pop()
    if (this.#slot === slot) this.#slot = null
    if (this.#spare.length < 8) this.#spare.push(slot)
  }

  #widen(slot: Slot): void {
    slot.time = lengthened(slot.time, this.#roster.places, Number.NEGATIVE_INFINITY)
    slot.value = lengthened(slot.value, this.#roster.places, 0)
  }

  #reserve(places: number): void {
    if (this.#value.length >= places) return
    this.#value = lengthened(this.#value, places, 0)
    this.#valueTime = lengthened(this.#valueTime, places, Number.NEGATIVE_INFINITY)
    this.#fresh = new Uint8Array(places)
  }

  snapshot(): AlignerSnapshot {
    return {
      slots: [...this.#slots.values()].map(({ key, time, value }) => ({
        key,
        time: time.slice(),
        value: value.slice(),
      })),
      closed: this.#closed,
      session: this.#session,
      value: this.#value.slice(),
      valueTime: this.#valueTime.slice(),
    }
  }

  restore(s: AlignerSnapshot): void {
    this.#slots.clear()
    this.#waiting.clear()
    this.#slot = null
    this.#spare = []
    for (const { key, time, value } of s.slots) {
      this.#slots.set(key, { key, time: time.slice(), value: value.slice() })
      this.#waiting.push(key)
    }
    this.#closed = s.closed
    this.#session = s.session
    this.#value = s.value.slice()
    this.#valueTime = s.valueTime.slice()
    this.#fresh = new Uint8Array(s.value.length)
    this.#expect()
  }
}

export interface AlignerSnapshot {
  readonly slots: readonly {
    readonly key: number
    readonly time: Float64Array
    readonly value: Float64Array
  }[]
  readonly closed: number
  readonly session: number
  readonly value: Float64Array
  readonly valueTime: Float64Array
}

function lengthened(array: Float64Array, length: number, rest: number): Float64Array {
  const longer = new Float64Array(length).fill(rest)
  longer.set(array)
  return longer
}
