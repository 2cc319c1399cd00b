/**
 * ‖A − B‖_F/√n of two symmetric n × n matrices, row-major, lower triangles read: no less than W2 of their
 * spectra (Hoffman & Wielandt 1953). 0 for n = 0.
 */
export function frobeniusCeiling(a: Float64Array, b: Float64Array, n: number): number {
  if (n === 0) return 0
  let below = 0
  let diagonal = 0
  for (let i = 0; i < n; i++) {
    const row = i * n
    for (let j = 0; j < i; j++) {
      const gap = a[row + j]! - b[row + j]!
      below += gap * gap
    }
    const gap = a[row + i]! - b[row + i]!
    diagonal += gap * gap
  }
  return Math.sqrt((2 * below + diagonal) / n)
}
