import type { Levels } from './aligner.ts'

export type Increment = 'log-return' | 'difference' | 'level'

/** Increments of one step by place; `has[i]` is 0 where there is none. Borrowed until the next call. */
export interface Increments {
  readonly value: Float64Array
  readonly has: Uint8Array
  readonly any: boolean
}

/**
 * Increments between two steps that follow on each other: ln(l/l₋₁), l − l₋₁, or the level less its own
 * exponential mean before this step. A signal has one only where both levels are fresh and it was not
 * withheld (a stuck transmitter) in either step.
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

  /** `span` in steps: the exponential mean of `level` weighs as a mean over so many, 2/(span + 1) a step. */
  constructor(kind: Increment, span: number) {
    this.#kind = kind
    this.#pull = 2 / (span + 1)
  }

  /** `withheld[i]` is 1 where the signal's value must not be used in this step. */
  take(levels: Levels, withheld: Uint8Array): Increments {
    const { places, afresh } = levels
    this.#reserve(places)
    let any = false
    for (let i = 0; i < places; i++) {
      const usable = levels.fresh[i] === 1 && withheld[i] === 0
      const followsOn = usable && this.#had[i] === 1 && !afresh
      this.#has[i] = followsOn ? 1 : 0
      this.#value[i] = 0
      this.#had[i] = usable ? 1 : 0
      if (!usable) continue
      const level = this.#kind === 'log-return' ? Math.log(levels.value[i]!) : levels.value[i]!
      if (this.#kind === 'level') this.#fromMean(i, level, followsOn)
      else {
        if (followsOn) this.#value[i] = level - this.#before[i]!
        this.#before[i] = level
      }
      if (followsOn) any = true
    }
    return { value: this.#value, has: this.#has, any }
  }

  #fromMean(i: number, level: number, followsOn: boolean): void {
    const count = this.#count[i]! + 1
    this.#count[i] = count
    if (followsOn) this.#value[i] = level - this.#mean[i]!
    const pull = Math.max(this.#pull, 1 / count)
    this.#mean[i] = this.#mean[i]! + pull * (level - this.#mean[i]!)
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
