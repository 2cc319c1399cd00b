import type { FeedTimer } from './context.ts'

/** Real time that may be behind before what was missed is given up instead of made good, milliseconds. */
const mostBehind = 1000

/**
 * Plays event time at `speed` times real time. The speed may be changed while it runs; Infinity does not
 * wait at all, 0 stands still. A listener that is too slow, or a machine that slept, is not chased: what it
 * is late by beyond a second is given up.
 */
export class Pace {
  readonly #timer: FeedTimer
  #speed: number
  #changed = new AbortController()
  /** Event time that has been played, milliseconds; null before the first. */
  #played: number | null = null
  /** When it was reached, by the timer. */
  #reached = 0

  constructor(speed: number, timer: FeedTimer) {
    this.#speed = speed
    this.#timer = timer
  }

  get speed(): number {
    return this.#speed
  }

  set speed(speed: number) {
    if (!(speed >= 0)) throw new RangeError(`a speed is a number of at least 0, not ${speed}`)
    this.#settle()
    this.#speed = speed
    this.#changed.abort()
    this.#changed = new AbortController()
  }

  /** Resolves when event time `time` (milliseconds) is due, or when `stop` is aborted. */
  async due(time: number, stop: AbortSignal): Promise<void> {
    if (this.#played === null) {
      this.#played = time
      this.#reached = this.#timer.lap()
      return
    }
    while (!stop.aborted && this.#speed !== Number.POSITIVE_INFINITY) {
      const left = (time - this.#played) / this.#speed - (this.#timer.lap() - this.#reached)
      if (!(left > 0)) break
      await this.#timer.wait(left, AbortSignal.any([stop, this.#changed.signal]))
    }
    if (time <= this.#played) return
    const now = this.#timer.lap()
    const planned = this.#reached + (time - this.#played) / this.#speed
    this.#reached = planned >= now - mostBehind && planned <= now ? planned : now
    this.#played = time
  }

  /** Moves what has been played on to the present, by the speed that held till now. */
  #settle(): void {
    if (this.#played === null || this.#speed === Number.POSITIVE_INFINITY) return
    const now = this.#timer.lap()
    this.#played += (now - this.#reached) * this.#speed
    this.#reached = now
  }
}
