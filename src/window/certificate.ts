/**
 * The truncation certificate ‖C − Ĉ‖_F/√n of two symmetric n × n matrices, row-major: no less than the
 * W2 distance of their spectra (Hoffman & Wielandt 1953; method page, section on truncation).
 */
export function truncationCertificate(c: Float64Array, truncated: Float64Array, n: number): number {
  if (n === 0) return 0
  let sum = 0
  for (let k = 0; k < n * n; k++) {
    const d = c[k]! - truncated[k]!
    sum += d * d
  }
  return Math.sqrt(sum / n)
}
