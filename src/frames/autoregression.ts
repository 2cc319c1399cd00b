import { medianOf } from './sliding-median.ts'

export const mostLags = 3
/** Values further from the median than so many robust deviations count as being there: a flash print is no memory. */
const fitWithin = 5

/** A fitted autoregression x_t − μ = Σ φ_k (x_{t−k} − μ) + e_t. */
export interface Autoregression {
  readonly mean: number
  /** φ_1 … φ_p; empty where independence fits best. */
  readonly weights: readonly number[]
}

/**
 * Yule–Walker fit of order 0 to 3, the order by Schwarz's criterion n ln σ² + p ln n (Schwarz 1978; Levinson
 * 1946 and Durbin 1960 for the recursion). `values` hold NaN where a value is missing; autocovariances are means
 * over the pairs that are there. Always stationary: the order stops before a reflection coefficient of 1.
 */
export function fitAutoregression(values: Float64Array): Autoregression {
  const x = withinReach(values)
  let sum = 0
  let n = 0
  for (const value of x) {
    if (Number.isNaN(value)) continue
    sum += value
    n++
  }
  if (n < 2 * mostLags) return { mean: n > 0 ? sum / n : 0, weights: [] }
  const mean = sum / n
  const covariance = Array.from({ length: mostLags + 1 }, (_, lag) => autocovariance(x, mean, lag))
  if (!(covariance[0]! > 0)) return { mean, weights: [] }
  let best: number[] = []
  let bestScore = n * Math.log(covariance[0]!)
  let weights: number[] = []
  let error = covariance[0]!
  for (let p = 1; p <= mostLags; p++) {
    let reflection = covariance[p]!
    for (let k = 0; k < p - 1; k++) reflection -= weights[k]! * covariance[p - 1 - k]!
    reflection /= error
    if (!(Math.abs(reflection) < 1)) break
    const before = weights
    weights = before.map((weight, k) => weight - reflection * before[p - 2 - k]!)
    weights.push(reflection)
    error *= 1 - reflection * reflection
    const score = n * Math.log(error) + p * Math.log(n)
    if (score < bestScore) {
      bestScore = score
      best = weights
    }
  }
  return { mean, weights: best }
}

/**
 * Mean over the pairs that are there, weighed down by 1 − lag/n as Yule and Walker do, which keeps the
 * matrix of a complete series positive definite.
 */
function autocovariance(x: Float64Array, mean: number, lag: number): number {
  let sum = 0
  let pairs = 0
  for (let t = lag; t < x.length; t++) {
    const product = (x[t]! - mean) * (x[t - lag]! - mean)
    if (Number.isNaN(product)) continue
    sum += product
    pairs++
  }
  return pairs === 0 ? 0 : (sum / pairs) * (1 - lag / x.length)
}

function withinReach(values: Float64Array): Float64Array {
  const there = values.filter((value) => !Number.isNaN(value))
  const middle = medianOf(there.slice(), there.length)
  const reach =
    fitWithin *
    1.4826 *
    medianOf(
      there.map((value) => Math.abs(value - middle)),
      there.length,
    )
  if (!(reach > 0)) return values
  return values.map((value) => Math.min(middle + reach, Math.max(middle - reach, value)))
}
