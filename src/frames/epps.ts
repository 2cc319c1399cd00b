/** Correlation at the step below this share of that at the longer step draws a warning. */
const warnBelow = 0.7
/** And only where the longer step shows a correlation worth the name. */
const correlationWanted = 0.05
const pull = 1 / 400

/**
 * The Epps effect (Epps 1979): sampled faster than signals update, correlations shrink towards zero. Compares
 * the mean correlation at the clock's step with that of sums over `multiple` steps, both by the variance of
 * the equally weighted sum of scaled signals: with n unit variances it is n + n(n − 1)·ρ̄.
 */
export class EppsCheck {
  readonly #multiple: number
  #sums = new Float64Array(0)
  #inSum = 0
  #short = 0
  #long = 0
  #shortWeight = 0
  #longWeight = 0

  /** `multiple`: steps in the longer one. */
  constructor(multiple = 6) {
    this.#multiple = multiple
  }

  /** A frame in units of the signals' own scales; missing entries 0. */
  push(scaled: Float64Array): void {
    if (this.#sums.length < scaled.length) {
      const wider = new Float64Array(scaled.length)
      wider.set(this.#sums)
      this.#sums = wider
    }
    const now = meanCorrelation(scaled)
    if (now !== null) {
      this.#short += pull * (now - this.#short)
      this.#shortWeight += pull * (1 - this.#shortWeight)
    }
    for (let i = 0; i < scaled.length; i++) this.#sums[i] = this.#sums[i]! + scaled[i]!
    if (++this.#inSum < this.#multiple) return
    const over = meanCorrelation(this.#sums)
    if (over !== null) {
      this.#long += this.#multiple * pull * (over - this.#long)
      this.#longWeight += this.#multiple * pull * (1 - this.#longWeight)
    }
    this.#sums.fill(0)
    this.#inSum = 0
  }

  /** Mean correlation at the step and at the longer one; null while too little has been seen. */
  get correlations(): { readonly step: number; readonly longer: number; readonly multiple: number } | null {
    if (this.#shortWeight < 0.5 || this.#longWeight < 0.5) return null
    return {
      step: this.#short / this.#shortWeight,
      longer: this.#long / this.#longWeight,
      multiple: this.#multiple,
    }
  }

  /** A sentence for the user where the step is too short for the signals; null where it is not. */
  get warning(): string | null {
    const c = this.correlations
    if (c === null || c.longer < correlationWanted || c.step >= warnBelow * c.longer) return null
    return `The clock's step is short for these signals: their mean correlation is ${c.step.toFixed(2)} at the step and ${c.longer.toFixed(2)} at ${c.multiple} steps (Epps effect). A longer step shows more.`
  }

  snapshot(): EppsSnapshot {
    return {
      sums: this.#sums.slice(),
      inSum: this.#inSum,
      short: this.#short,
      long: this.#long,
      shortWeight: this.#shortWeight,
      longWeight: this.#longWeight,
    }
  }

  restore(s: EppsSnapshot): void {
    this.#sums = s.sums.slice()
    this.#inSum = s.inSum
    this.#short = s.short
    this.#long = s.long
    this.#shortWeight = s.shortWeight
    this.#longWeight = s.longWeight
  }
}

export interface EppsSnapshot {
  readonly sums: Float64Array
  readonly inSum: number
  readonly short: number
  readonly long: number
  readonly shortWeight: number
  readonly longWeight: number
}

/** Mean over pairs of x_i x_j, over the mean of x_i²: the frame's own share in the mean correlation. */
function meanCorrelation(x: Float64Array): number | null {
  let sum = 0
  let square = 0
  for (const value of x) {
    sum += value
    square += value * value
  }
  const n = x.length
  if (n < 2 || square === 0) return null
  return (sum * sum - square) / ((n - 1) * square)
}
