import type { BulkLaw } from './edges.ts'

/**
 * Kolmogorov–Smirnov distance between eigenvalues, largest first, and a law stretched by `variance`. Values
 * not above `zero` count as exactly 0, where the law may hold a mass. 1 when there is nothing to compare.
 */
export function kolmogorovSmirnov(
  values: Float64Array,
  law: BulkLaw,
  variance: number,
  zero: number,
): number {
  const n = values.length
  if (n === 0 || !(variance > 0)) return 1
  let positive = 0
  while (positive < n && values[positive]! > zero) positive++
  const atZero = n - positive
  let distance = Math.max(Math.abs(law.atZero - atZero / n), 0)
  for (let k = 0; k < positive; k++) {
    const below = law.cdf(values[k]! / variance)
    const rank = n - k
    distance = Math.max(distance, Math.abs(rank / n - below), Math.abs((rank - 1) / n - below))
  }
  return distance
}

/** The same between two sets of eigenvalues, both largest first, the second stretched by `variance`. */
export function kolmogorovSmirnovOfTwo(values: Float64Array, others: Float64Array, variance: number): number {
  const n = values.length
  const m = others.length
  if (n === 0 || m === 0) return 1
  let distance = 0
  let i = 0
  let j = 0
  while (i < n && j < m) {
    const x = Math.max(values[i]!, others[j]! * variance)
    while (i < n && values[i]! >= x) i++
    while (j < m && others[j]! * variance >= x) j++
    distance = Math.max(distance, Math.abs(i / n - j / m))
  }
  return distance
}
