import { type Autoregression, fitAutoregression, mostLags } from './autoregression.ts'
import { EffectiveShare, type EffectiveShareSnapshot } from './effective-share.ts'

export type MemoryChoice = 'none' | 'prewhiten' | 'effective-sample'

/** Share of the steps of a fit in which the signal must have had a value; with fewer it goes on learning. */
const valuesWanted = 0.5

/** One signal's own history under `prewhiten`. */
interface History {
  /**
   * The values that the fit is made of, NaN where missing, though never more than `mostLags` of those in a
   * row: that is as far as a fit looks back. null once it is made.
   */
  learning: number[] | null
  /** Steps since the first of them, and how many of them had a value. */
  steps: number
  values: number
  model: Autoregression | null
}

/**
 * What to do about signals that remember: `prewhiten` passes the residuals of an autoregression fitted to
 * each signal's first `fitOver` steps, or to more until it has had half as many values; till then it is
 * missing, and as long as it has not moved at all it begins anew. `effective-sample` passes values as they are
 * and says by how much fewer independent frames they are worth; `none` does neither. A residual needs all the
 * values before it that the model looks back on: next to a missing one it is missing too.
 */
export class Memory {
  readonly #choice: MemoryChoice
  readonly #fitOver: number
  #histories: History[] = []
  /** The last values by signal, newest first, `mostLags` each; NaN where missing. */
  #last: Float64Array = new Float64Array(0)
  readonly #share = new EffectiveShare()

  constructor(choice: MemoryChoice, fitOver: number) {
    this.#choice = choice
    this.#fitOver = fitOver
  }

  /** Does `apply` change what it is given? */
  get remembers(): boolean {
    return this.#choice === 'prewhiten'
  }

  /** T_eff/T for the signals as they are; 1 unless `effective-sample` is chosen. */
  get effectiveShare(): number {
    return this.#choice === 'effective-sample' ? this.#share.value : 1
  }

  /** `x` and `present` by roster index, changed in place: residuals, and 0 with `present` 0 where there is none. */
  apply(x: Float64Array, present: Uint8Array): void {
    if (this.#choice === 'effective-sample') this.#share.push(x, present)
    if (this.#choice !== 'prewhiten') return
    this.#reserve(x.length)
    for (let i = 0; i < x.length; i++) {
      const value = present[i] === 1 ? x[i]! : Number.NaN
      const residual = this.#whiten(i, value)
      this.#remember(i, value)
      present[i] = Number.isNaN(residual) ? 0 : 1
      x[i] = Number.isNaN(residual) ? 0 : residual
    }
  }

  /** A step without any increment lay between: what follows does not continue what was before. */
  interrupt(): void {
    this.#share.interrupt()
    for (const [i, { learning }] of this.#histories.entries()) {
      if (learning !== null && learning.length > 0) this.#learn(i, Number.NaN)
      this.#remember(i, Number.NaN)
    }
  }

  #whiten(i: number, value: number): number {
    const { model } = this.#histories[i]!
    if (model === null) {
      this.#learn(i, value)
      return Number.NaN
    }
    const { mean, weights } = model
    let residual = value - mean
    for (let k = 0; k < weights.length; k++) residual -= weights[k]! * (this.#last[i * mostLags + k]! - mean)
    return residual
  }

  /** Steps count from the signal's first value, so that signals that begin together are fitted together. */
  #learn(i: number, value: number): void {
    const history = this.#histories[i]!
    const learning = history.learning!
    const missing = Number.isNaN(value)
    if (learning.length === 0 && missing) return
    history.steps++
    if (!missing) history.values++
    if (!missing || !learning.slice(-mostLags).every(Number.isNaN)) learning.push(value)
    if (history.steps < this.#fitOver || history.values < valuesWanted * this.#fitOver) return
    if (learning.every((past) => past === learning[0] || Number.isNaN(past))) {
      this.#histories[i] = blank()
      return
    }
    history.model = fitAutoregression(Float64Array.from(learning))
    history.learning = null
  }

  #remember(i: number, value: number): void {
    const start = i * mostLags
    this.#last.copyWithin(start + 1, start, start + mostLags - 1)
    this.#last[start] = value
  }

  #reserve(signals: number): void {
    if (this.#histories.length >= signals) return
    while (this.#histories.length < signals) this.#histories.push(blank())
    const longer = new Float64Array(signals * mostLags).fill(Number.NaN)
    longer.set(this.#last)
    this.#last = longer
  }

  snapshot(): MemorySnapshot {
    return {
      histories: structuredClone(this.#histories),
      last: this.#last.slice(),
      share: this.#share.snapshot(),
    }
  }

  restore({ histories, last, share }: MemorySnapshot): void {
    this.#histories = structuredClone(histories) as History[]
    this.#last = last.slice()
    this.#share.restore(share)
  }
}

export interface MemorySnapshot {
  readonly histories: readonly Readonly<History>[]
  readonly last: Float64Array
  readonly share: EffectiveShareSnapshot
}

const blank = (): History => ({ learning: [], steps: 0, values: 0, model: null })
