/** λ1 over the trace: the share of the leading mode. `values` largest first. 0 for an empty spectrum. */
export function leadingShare(values: Float64Array): number {
  const trace = sumOf(values)
  return trace > 0 ? values[0]! / trace : 0
}

/**
 * W2 between two spectra of equal length, each mass 1/n on every eigenvalue, both sorted the same way:
 * √(Σ(λi − λi⁰)²/n). @throws RangeError for different lengths
 */
export function wasserstein2(a: Float64Array, b: Float64Array): number {
  if (a.length !== b.length) throw new RangeError('spectra of different length')
  let square = 0
  for (let i = 0; i < a.length; i++) square += (a[i]! - b[i]!) ** 2
  return a.length === 0 ? 0 : Math.sqrt(square / a.length)
}

/** ‖A − B‖_F/√n of two symmetric n × n matrices: no W2 of their spectra exceeds it (Hoffman & Wielandt 1953). */
export function hoffmanWielandtCeiling(a: Float64Array, b: Float64Array, n: number): number {
  let square = 0
  for (let k = 0; k < n * n; k++) square += (a[k]! - b[k]!) ** 2
  return n === 0 ? 0 : Math.sqrt(square / n)
}

/** 1/Σv⁴ of a unit vector: about how many entries carry it. */
export function participation(vector: Float64Array): number {
  let fourth = 0
  for (const v of vector) fourth += v ** 4
  return 1 / fourth
}

/** Share of the variance in the first `modes` eigenvalues (Kritzman, Li, Page & Rigobon 2011). */
export function absorptionRatio(values: Float64Array, modes: number): number {
  return sumOf(values.subarray(0, modes)) / sumOf(values)
}

/** exp(−Σ p ln p), p = λ/Σλ (Roy & Vetterli 2007); eigenvalues at or below 0 count as 0. */
export function effectiveRank(values: Float64Array): number {
  const trace = sumOf(values)
  let entropy = 0
  for (const value of values) if (value > 0) entropy -= (value / trace) * Math.log(value / trace)
  return Math.exp(entropy)
}

/** Mean of the n(n−1)/2 correlations of an n × n correlation matrix. */
export function meanCorrelation(matrix: Float64Array, n: number): number {
  let sum = 0
  for (let i = 0; i < n; i++) for (let j = 0; j < i; j++) sum += matrix[i * n + j]!
  return n < 2 ? 0 : sum / ((n * (n - 1)) / 2)
}

function sumOf(values: Float64Array): number {
  let sum = 0
  for (const value of values) sum += value
  return sum
}
