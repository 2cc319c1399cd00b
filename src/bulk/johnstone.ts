import { tracyWidomUpper } from './tracy-widom.ts'

/** Where the largest eigenvalue of noise lies and how far it fluctuates, both in its own unit. */
export interface Centring {
  readonly centre: number
  readonly scale: number
}

/**
 * For the largest eigenvalue of XᵀX, X n × p of independent standard normal entries:
 * μ = (√(n−1) + √p)², σ = (√(n−1) + √p)(1/√(n−1) + 1/√p)^{1/3} (Johnstone 2001).
 */
export function johnstoneCentring(n: number, p: number): Centring {
  return centring(Math.sqrt(n - 1), Math.sqrt(p))
}

/** The same with n − ½ and p − ½, which is nearer in small samples (Ma 2012). n and p above ½. */
export function correctedCentring(n: number, p: number): Centring {
  return centring(Math.sqrt(n - 0.5), Math.sqrt(p - 0.5))
}

function centring(a: number, b: number): Centring {
  return { centre: (a + b) ** 2, scale: (a + b) * Math.cbrt(1 / a + 1 / b) }
}

/**
 * The limit that the largest eigenvalue of a covariance of p independent signals of variance 1 over n
 * independent frames, means known, exceeds with probability `level`: (μ + σ s)/n, corrected centring, s the
 * upper Tracy–Widom quantile. n need not be whole.
 */
export function noiseLimit(n: number, p: number, level: number): number {
  const { centre, scale } = correctedCentring(n, p)
  return (centre + scale * tracyWidomUpper(level)) / n
}
