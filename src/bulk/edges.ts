/** Lower and upper limit of a spectrum, in units of an eigenvalue. */
export interface Edges {
  readonly lower: number
  readonly upper: number
}

/** Distribution of noise eigenvalues, noise variance 1, many signals. */
export interface BulkLaw {
  readonly edges: Edges
  /** Mass at exactly 0. */
  readonly atZero: number
  /** P(λ ≤ x), the mass at 0 included for x ≥ 0. */
  cdf(x: number): number
  /**
   * Stieltjes transform ∫ρ(λ)dλ/(λ − x) at a real x no less than the upper edge: negative, rising to 0. It
   * tells where spikes show: λ is the sample of ℓ = λm/(λm + 1).
   */
  stieltjes(x: number): number
}
