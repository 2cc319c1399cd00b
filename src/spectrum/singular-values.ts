const mostSweeps = 60
/** Rows whose cosine is below this count as orthogonal. */
const orthogonal = 1e-14

/**
 * Singular values, largest first, of a matrix of `k` rows of `n` entries, k ≤ n, by one-sided Jacobi
 * rotations of the rows (Hestenes 1958): small ones keep their relative precision.
 */
export function singularValues(matrix: Float64Array, k: number, n: number): Float64Array {
  const a = matrix.slice(0, k * n)
  for (let sweep = 0, turned = true; turned && sweep < mostSweeps; sweep++) {
    turned = false
    for (let p = 0; p < k - 1; p++) {
      for (let q = p + 1; q < k; q++) if (turn(a, p * n, q * n, n)) turned = true
    }
  }
  const values = new Float64Array(k)
  for (let r = 0; r < k; r++) {
    let square = 0
    for (let i = r * n; i < (r + 1) * n; i++) square += a[i]! * a[i]!
    values[r] = Math.sqrt(square)
  }
  return values.sort().reverse()
}

/** Makes the rows at p and q orthogonal; false when they were. */
function turn(a: Float64Array, p: number, q: number, n: number): boolean {
  let pp = 0
  let qq = 0
  let pq = 0
  for (let i = 0; i < n; i++) {
    const x = a[p + i]!
    const y = a[q + i]!
    pp += x * x
    qq += y * y
    pq += x * y
  }
  if (Math.abs(pq) <= orthogonal * Math.sqrt(pp * qq)) return false
  const slope = (qq - pp) / (2 * pq)
  const t = (slope < 0 ? -1 : 1) / (Math.abs(slope) + Math.sqrt(1 + slope * slope))
  const c = 1 / Math.sqrt(1 + t * t)
  const s = c * t
  for (let i = 0; i < n; i++) {
    const x = a[p + i]!
    const y = a[q + i]!
    a[p + i] = c * x - s * y
    a[q + i] = s * x + c * y
  }
  return true
}
