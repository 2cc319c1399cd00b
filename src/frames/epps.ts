import { lengthened } from './pending-steps.ts'

/** Correlation at the step below this share of that at the longer step draws a warning. */
const warnBelow = 0.7
/** And only where the longer step shows a correlation worth the name. */
const correlationWanted = 0.05
/** Memory of the means, in steps. */
const pull = 1 / 400
/** Values that a signal's own variance must rest on, and longer steps that a comparison must. */
const valuesWanted = 20

/** Mean correlations at the clock's step and at a longer one, and the first over the second. */
export interface EppsComparison {
  readonly step: number
  readonly longer: number
  readonly ratio: number
  /** Steps in the longer one. */
  readonly multiple: number
}

/**
 * The Epps effect (Epps 1979): sampled faster than signals update, correlations shrink towards zero. Compares
 * the mean correlation at the clock's step with that of sums over `multiple` steps.
 */
export class EppsCheck {
  readonly #multiple: number
  readonly #short = new RunningCorrelation(pull)
  readonly #long: RunningCorrelation
  #sums: Float64Array = new Float64Array(0)
  /** Steps of the present sum in which the signal was there. */
  #parts: Float64Array = new Float64Array(0)
  #whole: Uint8Array = new Uint8Array(0)
  #inSum = 0

  /** `multiple`: steps in the longer one. */
  constructor(multiple = 6) {
    this.#multiple = multiple
    this.#long = new RunningCorrelation(multiple * pull)
  }

  /** One frame's values in any unit; what is not present counts as unknown. */
  push(x: Float64Array, present: Uint8Array): void {
    if (this.#sums.length < x.length) {
      this.#sums = lengthened(this.#sums, x.length, 0)
      this.#parts = lengthened(this.#parts, x.length, 0)
      this.#whole = new Uint8Array(x.length)
    }
    this.#short.push(x, present)
    for (let i = 0; i < x.length; i++) {
      if (present[i] === 0) continue
      this.#sums[i] = this.#sums[i]! + x[i]!
      this.#parts[i] = this.#parts[i]! + 1
    }
    if (++this.#inSum < this.#multiple) return
    for (let i = 0; i < x.length; i++) this.#whole[i] = this.#parts[i] === this.#multiple ? 1 : 0
    this.#long.push(this.#sums, this.#whole)
    this.interrupt()
  }

  /** A step was left out: a sum over it would be none. */
  interrupt(): void {
    this.#sums.fill(0)
    this.#parts.fill(0)
    this.#inSum = 0
  }

  /** null while too little has been seen, or where the longer step shows no correlation to compare with. */
  get comparison(): EppsComparison | null {
    const step = this.#short.value
    const longer = this.#long.value
    if (step === null || longer === null || longer < correlationWanted) return null
    return { step, longer, ratio: step / longer, multiple: this.#multiple }
  }

  /** A sentence for the user where the step is too short for the signals; null where it is not. */
  get warning(): string | null {
    const c = this.comparison
    if (c === null || c.ratio >= warnBelow) return null
    return `The clock's step is short for these signals: their mean correlation is ${c.step.toFixed(2)} at the step and ${c.longer.toFixed(2)} at ${c.multiple} steps (Epps effect). A longer step shows more.`
  }

  snapshot(): EppsSnapshot {
    return {
      short: this.#short.snapshot(),
      long: this.#long.snapshot(),
      sums: this.#sums.slice(),
      parts: this.#parts.slice(),
      inSum: this.#inSum,
    }
  }

  restore(s: EppsSnapshot): void {
    this.#short.restore(s.short)
    this.#long.restore(s.long)
    this.#sums = s.sums.slice()
    this.#parts = s.parts.slice()
    this.#whole = new Uint8Array(s.sums.length)
    this.#inSum = s.inSum
  }
}

export interface EppsSnapshot {
  readonly short: RunningCorrelationSnapshot
  readonly long: RunningCorrelationSnapshot
  readonly sums: Float64Array
  readonly parts: Float64Array
  readonly inSum: number
}

/** Running mean over the pairs of signals of x_i x_j/(σ_i σ_j), σ² the running mean of x²; all about zero. */
class RunningCorrelation {
  readonly #pull: number
  #square: Float64Array = new Float64Array(0)
  #count: Float64Array = new Float64Array(0)
  #mean = 0
  #frames = 0

  constructor(pull: number) {
    this.#pull = pull
  }

  push(x: Float64Array, present: Uint8Array): void {
    if (this.#square.length < x.length) {
      this.#square = lengthened(this.#square, x.length, 0)
      this.#count = lengthened(this.#count, x.length, 0)
    }
    let sum = 0
    let squares = 0
    let n = 0
    for (let i = 0; i < x.length; i++) {
      if (present[i] === 0) continue
      const count = this.#count[i]! + 1
      const square = x[i]! * x[i]!
      this.#count[i] = count
      this.#square[i] = this.#square[i]! + Math.max(this.#pull, 1 / count) * (square - this.#square[i]!)
      if (count < valuesWanted || !(this.#square[i]! > 0)) continue
      sum += x[i]! / Math.sqrt(this.#square[i]!)
      squares += square / this.#square[i]!
      n++
    }
    if (n < 2) return
    const frames = ++this.#frames
    const now = (sum * sum - squares) / (n * (n - 1))
    this.#mean += Math.max(this.#pull, 1 / frames) * (now - this.#mean)
  }

  get value(): number | null {
    return this.#frames < valuesWanted ? null : this.#mean
  }

  snapshot(): RunningCorrelationSnapshot {
    return {
      square: this.#square.slice(),
      count: this.#count.slice(),
      mean: this.#mean,
      frames: this.#frames,
    }
  }

  restore(s: RunningCorrelationSnapshot): void {
    this.#square = s.square.slice()
    this.#count = s.count.slice()
    this.#mean = s.mean
    this.#frames = s.frames
  }
}

export interface RunningCorrelationSnapshot {
  readonly square: Float64Array
  readonly count: Float64Array
  readonly mean: number
  readonly frames: number
}
