import type { Levels } from './aligner.ts'
import { lengthened } from './pending-steps.ts'

/** Unmoved frames that are never too many. */
const unmovedAllowed = 60
/** And so many times the longest earlier run. */
const unmovedFactor = 8
/** Frames of its own history that a signal must have; with fewer, its longest run is taken for so many. */
const historyWanted = 60

/**
 * Which signals repeat one value for longer than they do when well: for more than `stuckAfter`, or, learnt
 * from their own history, for more than 60 frames and 8 times the longest run before. A run is broken by a
 * silence and by the end of a session. A run that was called stuck does not count as history.
 */
export class Stillness {
  readonly #stuckAfter: number | null
  #value: Float64Array = new Float64Array(0)
  /** Fresh frames so far. */
  #frames: Float64Array = new Float64Array(0)
  #unmoved: Float64Array = new Float64Array(0)
  #since: Float64Array = new Float64Array(0)
  #longest: Float64Array = new Float64Array(0)
  #stuck = new Uint8Array(0)

  /** `stuckAfter` in milliseconds of event time; null: learnt. */
  constructor(stuckAfter: number | null) {
    this.#stuckAfter = stuckAfter
  }

  /** 1 where the signal is stuck. */
  get stuck(): Uint8Array {
    return this.#stuck
  }

  /** When the signal last moved, milliseconds since 1970. */
  since(place: number): number {
    return this.#since[place]!
  }

  seen(place: number): boolean {
    return (this.#frames[place] ?? 0) > 0
  }

  look({ places, fresh, value, time, follows }: Levels): void {
    this.#reserve(places)
    for (let i = 0; i < places; i++) {
      if (fresh[i] === 0) continue
      const first = this.#frames[i] === 0
      this.#frames[i] = this.#frames[i]! + 1
      if (first || value[i]! !== this.#value[i]!) {
        if (this.#stuck[i] === 0 && this.#unmoved[i]! > this.#longest[i]!)
          this.#longest[i] = this.#unmoved[i]!
        this.#value[i] = value[i]!
        this.#unmoved[i] = 0
        this.#since[i] = time
        this.#stuck[i] = 0
      } else if (follows === 'directly' || this.#stuck[i] === 1) {
        this.#unmoved[i] = this.#unmoved[i]! + 1
        if (this.#stuck[i] === 0 && this.#tooStill(i, time)) this.#stuck[i] = 1
      } else {
        this.#unmoved[i] = 0
        this.#since[i] = time
      }
    }
  }

  #tooStill(i: number, time: number): boolean {
    if (this.#stuckAfter !== null) return time - this.#since[i]! > this.#stuckAfter
    const unmoved = this.#unmoved[i]!
    const known = this.#frames[i]! - unmoved >= historyWanted
    const longest = known ? this.#longest[i]! : Math.max(historyWanted, this.#longest[i]!)
    return unmoved > Math.max(unmovedAllowed, unmovedFactor * longest)
  }

  #reserve(places: number): void {
    if (this.#value.length >= places) return
    this.#value = lengthened(this.#value, places, 0)
    this.#frames = lengthened(this.#frames, places, 0)
    this.#unmoved = lengthened(this.#unmoved, places, 0)
    this.#since = lengthened(this.#since, places, 0)
    this.#longest = lengthened(this.#longest, places, 0)
    const stuck = new Uint8Array(places)
    stuck.set(this.#stuck)
    this.#stuck = stuck
  }

  snapshot(): StillnessSnapshot {
    return {
      value: this.#value.slice(),
      frames: this.#frames.slice(),
      unmoved: this.#unmoved.slice(),
      since: this.#since.slice(),
      longest: this.#longest.slice(),
      stuck: this.#stuck.slice(),
    }
  }

  restore(s: StillnessSnapshot): void {
    this.#value = s.value.slice()
    this.#frames = s.frames.slice()
    this.#unmoved = s.unmoved.slice()
    this.#since = s.since.slice()
    this.#longest = s.longest.slice()
    this.#stuck = s.stuck.slice()
  }
}

export interface StillnessSnapshot {
  readonly value: Float64Array
  readonly frames: Float64Array
  readonly unmoved: Float64Array
  readonly since: Float64Array
  readonly longest: Float64Array
  readonly stuck: Uint8Array
}
