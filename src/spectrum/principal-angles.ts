import { singularValues } from './singular-values.ts'

/**
 * Principal angles between the spans of two sets of k orthonormal rows of length n, in radians, smallest
 * first. Cosines are the singular values of A Bᵀ, sines those of B less its projection on A; each angle is
 * taken from the one that is exact there (Björck & Golub 1973).
 */
export function principalAngles(a: Float64Array, b: Float64Array, k: number, n: number): Float64Array {
  const inner = innerProducts(a, b, k, n)
  const rest = b.slice(0, k * n)
  for (let c = 0; c < k; c++) {
    for (let r = 0; r < k; r++) {
      const share = inner[r * k + c]!
      for (let i = 0; i < n; i++) rest[c * n + i] = rest[c * n + i]! - share * a[r * n + i]!
    }
  }
  const cosines = singularValues(inner, k, k)
  const sines = singularValues(rest, k, n).reverse()
  return Float64Array.from({ length: k }, (_, i) =>
    sines[i]! < Math.SQRT1_2 ? Math.asin(sines[i]!) : Math.acos(Math.min(1, cosines[i]!)),
  )
}

/**
 * Overlap of the spans of two sets of k orthonormal rows of length n: the mean squared cosine of their
 * principal angles, ‖A Bᵀ‖²_F/k. 1 for the same span, 0 for orthogonal ones, k/n on average by chance.
 * 1 when k is 0.
 */
export function subspaceOverlap(a: Float64Array, b: Float64Array, k: number, n: number): number {
  if (k === 0) return 1
  const inner = innerProducts(a, b, k, n)
  let sum = 0
  for (let i = 0; i < k * k; i++) sum += inner[i]! * inner[i]!
  return Math.min(1, sum / k)
}

/** A Bᵀ, k × k row-major. */
function innerProducts(a: Float64Array, b: Float64Array, k: number, n: number): Float64Array {
  const inner = new Float64Array(k * k)
  for (let r = 0; r < k; r++) {
    for (let c = 0; c < k; c++) {
      let sum = 0
      for (let i = 0; i < n; i++) sum += a[r * n + i]! * b[c * n + i]!
      inner[r * k + c] = sum
    }
  }
  return inner
}
