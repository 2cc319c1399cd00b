export type BulkModel = 'marchenko-pastur' | 'exponential' | 'resampled'

/** An eigenvalue beyond the edge at the stated level. */
export interface Escape {
  readonly value: number
  /**
   * Participation ratio 1/Σv⁴ of its eigenvector: about how many signals share it, 1 and more; 0 when the
   * spectrum that was fitted did not hold the vector.
   */
  readonly signals: number
}

/** The part of the spectrum that noise alone explains. */
export interface Bulk {
  readonly model: BulkModel
  readonly lower: number
  readonly upper: number
  /** Probability that the largest noise eigenvalue counts as an escape. */
  readonly level: number
  /** The limit at that level: an eigenvalue above it is an escape. */
  readonly limit: number
  /** Kolmogorov–Smirnov distance between the bulk's eigenvalues and the fitted law. */
  readonly fit: number
  /** Variance of the noise, after deflation. */
  readonly variance: number
  /** N / T_eff as given, N less the escapes. */
  readonly q: number
  /** N / T_eff as the bulk's first two moments have it, m2/m1² − 1: above q when memory or tails widen it. */
  readonly momentQ: number
  readonly escapes: readonly Escape[]
}
