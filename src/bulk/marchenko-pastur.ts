import type { BulkLaw, Edges } from './edges.ts'

/**
 * Marchenko–Pastur law: the eigenvalues of a covariance of N independent signals of variance `variance` over
 * T independent frames with equal weights, q = N/T (Marchenko & Pastur 1967).
 */
export function marchenkoPasturEdges(q: number, variance = 1): Edges {
  const root = Math.sqrt(q)
  return { lower: variance * (1 - root) ** 2, upper: variance * (1 + root) ** 2 }
}

/** Density of the continuous part, √((b−x)(x−a))/(2πσ²qx); for q > 1 a mass of 1 − 1/q lies at 0 besides. */
export function marchenkoPasturDensity(x: number, q: number, variance = 1): number {
  const { lower, upper } = marchenkoPasturEdges(q, variance)
  if (!(x > lower && x < upper)) return 0
  return Math.sqrt((upper - x) * (x - lower)) / (2 * Math.PI * variance * q * x)
}

/**
 * P(λ ≤ x). For q > 1 the T eigenvalues that are not 0 are those of the transposed problem, of ratio 1/q,
 * times q.
 */
export function marchenkoPasturCdf(x: number, q: number, variance = 1): number {
  const unit = x / variance
  if (q <= 1) return cdfUpToOne(unit, q)
  return unit < 0 ? 0 : 1 - 1 / q + cdfUpToOne(unit / q, 1 / q) / q
}

/** The integral of the density in closed form for q ≤ 1, variance 1: an elementary integral of √R/x. */
function cdfUpToOne(x: number, q: number): number {
  const { lower: a, upper: b } = marchenkoPasturEdges(q)
  if (x <= a) return 0
  if (x >= b) return 1
  const root = Math.sqrt((b - x) * (x - a))
  const middle = Math.asin(clip((x - 1 - q) / (2 * Math.sqrt(q))))
  const inverse = Math.asin(clip(((1 + q) * x - (1 - q) ** 2) / (2 * x * Math.sqrt(q))))
  return Math.max(0, clip(0.5 + (root + (1 + q) * middle - (1 - q) * inverse) / (2 * Math.PI * q)))
}

const clip = (x: number): number => Math.min(1, Math.max(-1, x))

/**
 * x with P(λ ≤ x) = p, by bisection of the closed form; 0 where the mass at 0 covers p.
 *
 * @throws RangeError when p is not in [0, 1]
 */
export function marchenkoPasturQuantile(p: number, q: number, variance = 1): number {
  if (!(p >= 0 && p <= 1)) throw new RangeError(`a probability is needed, not ${p}`)
  if (q > 1 && p <= 1 - 1 / q) return 0
  let { lower, upper } = marchenkoPasturEdges(q)
  while (upper - lower > 1e-15 * upper) {
    const middle = (lower + upper) / 2
    if (middle <= lower || middle >= upper) break
    if (marchenkoPasturCdf(middle, q) < p) lower = middle
    else upper = middle
  }
  return variance * ((lower + upper) / 2)
}

/** E λᵏ, k a whole number from 0: Σ qʳ/(r+1) C(k,r) C(k−1,r), r = 0 … k − 1 (Bai & Silverstein 2010, 3.1.1). */
export function marchenkoPasturMoment(k: number, q: number, variance = 1): number {
  if (k === 0) return 1
  let sum = 0
  let term = 1
  for (let r = 0; r < k; r++) {
    sum += term / (r + 1)
    term *= (q * (k - r) * (k - 1 - r)) / (r + 1) ** 2
  }
  return variance ** k * sum
}

/** E ln λ = ln σ² − 1 + ((q − 1)/q) ln(1 − q), 0 < q < 1. */
export const marchenkoPasturMeanLog = (q: number, variance = 1): number =>
  Math.log(variance) - 1 + ((q - 1) / q) * Math.log1p(-q)

export function marchenkoPasturLaw(q: number): BulkLaw {
  const edges = marchenkoPasturEdges(q)
  return {
    edges,
    atZero: q > 1 ? 1 - 1 / q : 0,
    cdf: (x) => marchenkoPasturCdf(x, q),
    stieltjes: (x) => {
      // the root of q x m² + (x + q − 1) m + 1 = 0 that vanishes far out
      const b = x + q - 1
      return -2 / (b + Math.sqrt(Math.max(0, (x - edges.lower) * (x - edges.upper))))
    },
  }
}
