export type BulkModel = 'marchenko-pastur' | 'exponential' | 'resampled'

/** An eigenvalue beyond the edge at the stated level. */
export interface Escape {
  readonly value: number
  /** Participation ratio 1/Σv⁴ of its eigenvector: about how many signals share it. */
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
  /** N / T_eff as fitted or given. */
  readonly q: number
  readonly escapes: readonly Escape[]
}
