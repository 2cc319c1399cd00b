import type { Levels } from './aligner.ts'

/** Levels and increments beyond this are no quantities but faults: their squares and sums must stay finite. */
export const largest = 1e100

export type Increment = 'log-return' | 'difference' | 'level'

/** Increments of one step by place, finite; `has[i]` is 0 where there is none. Borrowed until the next call. */
export interface Increments {
  readonly value: Float64Array
  readonly has: Uint8Array
  readonly any: boolean
}

/**
 * Increments between two steps that follow on each other: ln(l/l₋₁), l − l₋₁, or the level less its own
 * exponential mean before this step. A signal has one only where both levels are fresh, and it was not
 * withheld (a stuck transmitter) in either step. After a silence, or in another session, there is none.
 */
export class IncrementTaker {
  readonly #kind: Increment
  readonly #pull: number
  #before: Float64Array = new Float64Array(0)
  #had: Uint8Array = new Uint8Array(0)
  #mean: Float64Array = new Float64Array(0)
  #count: Float64Array = new Float64Array(0)
  #value: Float64Array = new Float64Array(0)
  #has: Uint8Array = new Uint8Array(0)

  /**
   * `span` in steps: the exponential mean of `level` pulls by 2/(span + 1) a step, so that its weights have
   * the same centre of mass as a plain mean over `span` steps (Roberts 1959); a time constant of span/2 steps.
   */
  constructor(kind: Increment, span: number) {
    this.#kind = kind
    this.#pull = 2 / (span + 1)
  }

  /** `withheld[i]` is 1 where the signal's value must not be used in this step. */
  take(levels: Levels, withheld: Uint8Array): Increments {
    const { places, follows, fresh, value } = levels
    this.#reserve(places)
    const direct = follows === 'directly'
    const log = this.#kind === 'log-return'
    let any = false
    for (let i = 0; i < places; i++) {
      const had = this.#had[i] === 1 && direct
      this.#has[i] = 0
      this.#value[i] = 0
      this.#had[i] = 0
      if (fresh[i] === 0 || withheld[i] === 1) continue
      const level = log ? Math.log(value[i]!) : value[i]!
      if (!(Math.abs(level) <= largest)) continue
      this.#had[i] = 1
      if (had) {
        this.#value[i] = level - (this.#kind === 'level' ? this.#mean[i]! : this.#before[i]!)
        this.#has[i] = 1
        any = true
      }
      this.#before[i] = level
      if (this.#kind === 'level') this.#follow(i, level)
    }
    return { value: this.#value, has: this.#has, any }
  }

  /** The exponential mean; over its first steps the plain one. */
  #follow(i: number, level: number): void {
    const count = this.#count[i]! + 1
    this.#count[i] = count
    this.#mean[i] = this.#mean[i]! + Math.max(this.#pull, 1 / count) * (level - this.#mean[i]!)
  }

  #reserve(places: number): void {
    if (this.#before.length >= places) return
    const grow = (array: Float64Array): Float64Array => {
      const longer = new Float64Array(places)
      longer.set(array)
      return longer
    }
    this.#before = grow(this.#before)
    this.#mean = grow(this.#mean)
    this.#count = grow(this.#count)
    this.#value = grow(this.#value)
    const had = new Uint8Array(places)
    had.set(this.#had)
    this.#had = had
    this.#has = new Uint8Array(places)
  }

  snapshot(): IncrementSnapshot {
    return {
      before: this.#before.slice(),
      had: this.#had.slice(),
      mean: this.#mean.slice(),
      count: this.#count.slice(),
    }
  }

  restore(s: IncrementSnapshot): void {
    this.#before = s.before.slice()
    this.#had = s.had.slice()
    this.#mean = s.mean.slice()
    this.#count = s.count.slice()
    this.#value = new Float64Array(s.before.length)
    this.#has = new Uint8Array(s.before.length)
  }
}

export interface IncrementSnapshot {
  readonly before: Float64Array
  readonly had: Uint8Array
  readonly mean: Float64Array
  readonly count: Float64Array
}
