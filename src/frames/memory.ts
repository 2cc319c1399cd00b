import { type Autoregression, fitAutoregression, mostLags } from './autoregression.ts'

export type MemoryChoice = 'none' | 'prewhiten' | 'effective-sample'

/** One signal's own history. */
interface History {
  /** The values that the fit is made of, NaN where missing; null once it is made. */
  learning: number[] | null
  model: Autoregression | null
  /** The last values, newest first; NaN where missing. */
  last: number[]
  /** Exponential means of x_t x_{t−1} and x_t², for the effective sample size. */
  lagged: number
  square: number
}

const pullOfEffective = 1 / 250

/**
 * What to do about signals that remember: `prewhiten` passes the residuals of an autoregression fitted to
 * each signal's first `fitOver` steps (till then it is missing); `effective-sample` passes values as they are
 * and says by how much fewer independent frames they are worth; `none` does neither.
 */
export class Memory {
  readonly #choice: MemoryChoice
  readonly #fitOver: number
  #histories: History[] = []

  constructor(choice: MemoryChoice, fitOver: number) {
    this.#choice = choice
    this.#fitOver = fitOver
  }

  /** Does `apply` change what it is given? */
  get remembers(): boolean {
    return this.#choice === 'prewhiten'
  }

  /** `x` and `present` by roster index, changed in place: residuals, and 0 with `present` 0 where there is none. */
  apply(x: Float64Array, present: Uint8Array): void {
    if (this.#choice === 'none') return
    while (this.#histories.length < x.length) {
      this.#histories.push({ learning: [], model: null, last: [], lagged: 0, square: 0 })
    }
    for (let i = 0; i < x.length; i++) {
      const history = this.#histories[i]!
      const value = present[i] === 1 ? x[i]! : Number.NaN
      if (this.#choice === 'effective-sample') follow(history, value)
      else {
        const residual = this.#whiten(history, value)
        present[i] = Number.isNaN(residual) ? 0 : 1
        x[i] = Number.isNaN(residual) ? 0 : residual
      }
      history.last.unshift(value)
      if (history.last.length > mostLags) history.last.pop()
    }
  }

  /**
   * T_eff/T for the signals as they are: (1 − r²)/(1 + r²), r their mean lag-1 autocorrelation (Bartlett
   * 1935); 1 unless `effective-sample` is chosen.
   */
  get effectiveShare(): number {
    if (this.#choice !== 'effective-sample') return 1
    let sum = 0
    let count = 0
    for (const { lagged, square } of this.#histories) {
      if (!(square > 0)) continue
      sum += lagged / square
      count++
    }
    const r = count > 0 ? Math.min(0.999, Math.max(0, sum / count)) : 0
    return (1 - r * r) / (1 + r * r)
  }

  #whiten(history: History, value: number): number {
    if (history.learning !== null) {
      if (history.learning.length > 0 || !Number.isNaN(value)) history.learning.push(value)
      if (history.learning.length < this.#fitOver) return Number.NaN
      history.model = fitAutoregression(Float64Array.from(history.learning))
      history.learning = null
      return Number.NaN
    }
    const { mean, weights } = history.model!
    let residual = value - mean
    for (const [k, weight] of weights.entries()) residual -= weight * ((history.last[k] ?? Number.NaN) - mean)
    return residual
  }

  snapshot(): MemorySnapshot {
    return { histories: structuredClone(this.#histories) }
  }

  restore({ histories }: MemorySnapshot): void {
    this.#histories = structuredClone(histories) as History[]
  }
}

function follow(history: History, value: number): void {
  const before = history.last[0]
  if (before === undefined || Number.isNaN(value) || Number.isNaN(before)) return
  history.lagged += pullOfEffective * (value * before - history.lagged)
  history.square += pullOfEffective * (value * value - history.square)
}

export interface MemorySnapshot {
  readonly histories: readonly Readonly<History>[]
}
