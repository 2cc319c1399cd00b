import { largest } from './increments.ts'
import { medianOf, SlidingMedian, type SlidingMedianSnapshot } from './sliding-median.ts'

/** Median of |x| times this is the standard deviation of a normal x: 1/Φ⁻¹(3/4). */
export const normalConsistency = 1.4826022185056018
/** Entries that a signal's own scale must rest on. */
export const scaleWants = 20

export interface ScalerOptions {
  /** Frames over which a signal's own scale is taken. */
  readonly span: number
  /** After so many entries of a signal its scale is fixed for good; null: it follows. */
  readonly fixedAfter: number | null
  readonly commonVolatility: 'remove' | 'keep'
  /** ±K in robust standard deviations; null: nothing is truncated. */
  readonly truncateAt: number | null
}

/** One scaled frame; arrays are fresh, of the roster's length. */
export interface Scaled {
  readonly present: Uint8Array
  readonly scaled: Float64Array
  readonly cleaned: Float64Array
  readonly clipped: number
  readonly clippedSignals: readonly number[]
  readonly volatility: number
}

/**
 * Scale, common volatility, truncation, in this order: common volatility must leave before anything is
 * clipped, or the loud hours are clipped hardest. A signal's own scale is the trailing median of its |x|
 * (its root mean square where more than half of the entries are 0); the common volatility of a frame is the
 * median over its signals of |x|/scale (Tyler 1987's spatial sign with a robust norm). A signal without a
 * scale, too young or not moving at all, is missing; so is an entry whose quotient is out of all bounds. With
 * nothing to remove and nothing to truncate, values
 * pass as they are.
 */
export class Scaler {
  readonly #options: ScalerOptions
  #scales: SlidingMedian[] = []
  #seen: number[] = []
  #fixed: number[] = []
  #scratch = new Float64Array(0)

  constructor(options: ScalerOptions) {
    this.#options = options
  }

  /** Do values pass as they are? */
  get plain(): boolean {
    return this.#options.commonVolatility === 'keep' && this.#options.truncateAt === null
  }

  /** `x` by roster index with its presence; null while no signal has a scale yet. */
  scale(x: Float64Array, present: Uint8Array): Scaled | null {
    if (this.plain) {
      const values = x.slice()
      return {
        present: present.slice(),
        scaled: values,
        cleaned: values,
        clipped: 0,
        clippedSignals: [],
        volatility: 1,
      }
    }
    const n = x.length
    while (this.#scales.length < n) {
      this.#scales.push(new SlidingMedian(this.#options.span))
      this.#seen.push(0)
      this.#fixed.push(0)
    }
    if (this.#scratch.length < n) this.#scratch = new Float64Array(n)
    const has = new Uint8Array(n)
    const scaled = new Float64Array(n)
    let count = 0
    for (let i = 0; i < n; i++) {
      if (present[i] === 0) continue
      const scale = this.#scaleOf(i)
      this.#learn(i, x[i]!)
      const z = x[i]! / scale
      if (!(scale > 0) || !(Math.abs(z) <= largest)) continue
      has[i] = 1
      scaled[i] = z
      this.#scratch[count++] = Math.abs(z)
    }
    if (count === 0) return null
    const volatility = this.#options.commonVolatility === 'remove' ? this.#volatility(count) : 1
    if (volatility !== 1) {
      for (let i = 0; i < n; i++) {
        const z = scaled[i]! / volatility
        const bounded = Math.abs(z) <= largest
        scaled[i] = bounded ? z : 0
        if (!bounded) has[i] = 0
      }
    }
    return { present: has, scaled, volatility, ...this.#truncate(scaled) }
  }

  /** Scale of signal i by roster index, in the unit of its increments; 0 while it has none. */
  #scaleOf(i: number): number {
    const fixed = this.#fixed[i]!
    if (fixed > 0) return fixed
    const scale = this.#scales[i]!
    if (scale.count < scaleWants) return 0
    return normalConsistency * scale.median || scale.rootMeanSquare
  }

  #learn(i: number, x: number): void {
    if (this.#fixed[i]! > 0) return
    this.#scales[i]!.push(Math.abs(x))
    this.#seen[i] = this.#seen[i]! + 1
    const { fixedAfter } = this.#options
    if (fixedAfter !== null && this.#seen[i]! >= fixedAfter) this.#fixed[i] = this.#scaleOf(i)
  }

  /** Of the first `count` entries of the scratch; 1 for a frame in which nothing moved. */
  #volatility(count: number): number {
    let square = 0
    for (let k = 0; k < count; k++) square += this.#scratch[k]! ** 2
    return normalConsistency * medianOf(this.#scratch, count) || Math.sqrt(square / count) || 1
  }

  #truncate(scaled: Float64Array): Pick<Scaled, 'cleaned' | 'clipped' | 'clippedSignals'> {
    const K = this.#options.truncateAt
    const clippedSignals: number[] = []
    if (K !== null)
      for (let i = 0; i < scaled.length; i++) if (Math.abs(scaled[i]!) > K) clippedSignals.push(i)
    if (K === null || clippedSignals.length === 0) return { cleaned: scaled, clipped: 0, clippedSignals }
    const cleaned = scaled.slice()
    for (const i of clippedSignals) cleaned[i] = Math.sign(scaled[i]!) * K
    return { cleaned, clipped: clippedSignals.length, clippedSignals }
  }

  snapshot(): ScalerSnapshot {
    return {
      scales: this.#scales.map((scale) => scale.snapshot()),
      seen: [...this.#seen],
      fixed: [...this.#fixed],
    }
  }

  restore(s: ScalerSnapshot): void {
    this.#scales = s.scales.map((snapshot) => {
      const scale = new SlidingMedian(this.#options.span)
      scale.restore(snapshot)
      return scale
    })
    this.#seen = [...s.seen]
    this.#fixed = [...s.fixed]
  }
}

export interface ScalerSnapshot {
  readonly scales: readonly SlidingMedianSnapshot[]
  readonly seen: readonly number[]
  readonly fixed: readonly number[]
}
