import { tracyWidomQuantile } from './tracy-widom.ts'

export interface Centring {
  readonly centre: number
  readonly scale: number
}

/**
 * Where the largest eigenvalue of p × p white Wishart noise with n degrees of freedom lies, and how much it
 * fluctuates: μ = (√(n−1) + √p)², σ = (√(n−1) + √p)(1/√(n−1) + 1/√p)^{1/3} (Johnstone 2001).
 */
export function johnstoneCentring(n: number, p: number): Centring {
  return centring(Math.sqrt(n - 1), Math.sqrt(p))
}

/** The same with n − ½ and p − ½, which is nearer in small samples (Ma 2012). */
export function correctedCentring(n: number, p: number): Centring {
  return centring(Math.sqrt(n - 0.5), Math.sqrt(p - 0.5))
}

function centring(a: number, b: number): Centring {
  return { centre: (a + b) ** 2, scale: (a + b) * Math.cbrt(1 / a + 1 / b) }
}

/**
 * The limit above which the largest eigenvalue of a p × p noise covariance of n frames, noise variance 1, is
 * an escape at level α: (μ + s_α σ)/n, s_α of Tracy–Widom, β = 1 (Johnstone 2001; Ma 2012). n may be a
 * fraction: an effective number.
 */
export function noiseLimit(n: number, p: number, level: number): number {
  const { centre, scale } = correctedCentring(Math.max(n, 1), Math.max(p, 1))
  return (centre + tracyWidomQuantile(1 - level) * scale) / n
}
