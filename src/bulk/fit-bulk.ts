import type { Spectrum } from '../spectrum/spectrum.ts'
import type { Bulk } from './bulk.ts'
import { kolmogorovSmirnov, kolmogorovSmirnovOfTwo } from './kolmogorov.ts'
import { boxcarNoise, exponentialNoise, type NoiseModel } from './noise-model.ts'
import { noiseVariance } from './noise-variance.ts'
import { participationRatio } from './participation.ts'
import type { ResampledLimit } from './resampled-edge.ts'
import { tracyWidomUpper } from './tracy-widom.ts'

export interface BulkOptions {
  /** Chance that the largest noise eigenvalue counts as an escape, between 0 and 1. */
  readonly level: number
  /** a of an exponential memory; null for a boxcar. */
  readonly decay: number | null
  /** Scale of the matrix. Left out: covariance, whose limit is the higher of the two. */
  readonly scale?: 'correlation' | 'covariance'
}

/** Eigenvalues below this part of the largest are zeros that rounding has moved. */
const rounding = 1e-10

/**
 * Fits the noise bulk by sequential deflation (Kritchman & Nadler 2009): as long as the largest eigenvalue
 * left exceeds the Tracy–Widom limit for the p eigenvalues left and the noise variance beside the escapes, it
 * is an escape. The trace need not be N.
 *
 * A correlation matrix has the limit of correlations for the first test alone: a common mode unties the
 * variances of the noise beside it, and then the limit of covariances holds, on the safe side.
 */
export class BulkFitter {
  readonly #options: BulkOptions
  readonly #noise: NoiseModel
  readonly #quantile: number

  /** @throws RangeError when the level is not between 0 and 1 */
  constructor(options: BulkOptions) {
    this.#options = options
    this.#noise = options.decay === null ? boxcarNoise : exponentialNoise
    this.#quantile = tracyWidomUpper(options.level)
  }

  /**
   * `effective`: number of independent frames that the window is worth, positive. With `resampled`, its limit
   * and edges take the place of the law's. The spectrum should hold the vectors of all escapes: ask the solver
   * for `escapes.length` modes and fit again where it does not.
   */
  fit(spectrum: Spectrum, effective: number, resampled: ResampledLimit | null = null): Bulk {
    const { values, n } = spectrum
    let trace = 0
    for (let k = 0; k < n; k++) trace += values[k]!
    const zero = rounding * Math.abs(values[0] ?? 0)
    let escaped = 0
    let law = this.#noise.law(Math.max(1, n), effective)
    let variance = n > 0 ? Math.max(0, trace) / n : 0
    let limit = variance * this.#limit(0, n, effective, resampled)
    while (escaped < n - 1 && values[escaped]! > Math.max(limit, zero)) {
      escaped++
      law = this.#noise.law(n - escaped, effective)
      variance = noiseVariance(values, escaped, trace, law)
      limit = variance * this.#limit(escaped, n, effective, resampled)
    }
    const bulk = values.subarray(escaped)
    const edges = resampled ?? law.edges
    return {
      model: resampled === null ? this.#noise.model : 'resampled',
      lower: variance * edges.lower,
      upper: variance * edges.upper,
      level: this.#options.level,
      limit,
      fit:
        resampled === null
          ? kolmogorovSmirnov(bulk, law, variance, zero)
          : kolmogorovSmirnovOfTwo(bulk, resampled.spectrum, variance),
      variance,
      q: Math.max(1, n - escaped) / effective,
      momentQ: momentQ(bulk),
      escapes: Array.from({ length: escaped }, (_, k) => ({
        value: values[k]!,
        signals: k < spectrum.modes ? participationRatio(spectrum.vectors, k * n, n) : 0,
      })),
    }
  }

  /** The limit beside `escaped` escapes, noise variance 1. */
  #limit(escaped: number, n: number, effective: number, resampled: ResampledLimit | null): number {
    if (resampled !== null) return resampled.limit
    const ofCorrelation = escaped === 0 && this.#options.scale === 'correlation'
    const p = Math.max(1, n - escaped)
    const { centre, scale } = this.#noise[ofCorrelation ? 'correlation' : 'covariance'](p, effective)
    return centre + this.#quantile * scale
  }
}

/** m2/m1² − 1 of the bulk: q for Marchenko–Pastur, and N/T_eff for an exponential memory. */
function momentQ(bulk: Float64Array): number {
  let first = 0
  let second = 0
  for (const value of bulk) {
    first += value
    second += value * value
  }
  return first > 0 ? (second * bulk.length) / (first * first) - 1 : 0
}
