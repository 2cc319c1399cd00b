const sweepsPerValue = 60

/**
 * All eigenvalues and eigenvectors of a symmetric tridiagonal matrix by implicit QL with vectors (Bowdler,
 * Martin, Reinsch & Wilkinson 1968): slower than inverse iteration, O(n³), and orthogonal whatever the
 * spectrum. `coupling[i]` joins i − 1 and i; both arrays are destroyed, `diagonal` receives the eigenvalues,
 * unordered, row j of `rows` (n × n) the vector of the j-th. False when it does not converge.
 */
export function tridiagonalQl(
  diagonal: Float64Array,
  coupling: Float64Array,
  n: number,
  rows: Float64Array,
): boolean {
  const d = diagonal
  const e = coupling
  rows.fill(0, 0, n * n)
  for (let i = 0; i < n; i++) rows[i * n + i] = 1
  for (let i = 1; i < n; i++) e[i - 1] = e[i]!
  if (n > 0) e[n - 1] = 0
  let norm = 0
  for (let i = 0; i < n; i++) norm = Math.max(norm, Math.abs(d[i]!) + Math.abs(e[i]!))
  const small = Number.EPSILON * norm
  let sweeps = 0
  for (let l = 0; l < n; l++) {
    for (;;) {
      let m = l
      while (m < n - 1 && Math.abs(e[m]!) > small) m++
      if (m === l) break
      if (++sweeps > sweepsPerValue * n) return false
      sweep(d, e, l, m, n, rows)
    }
  }
  return true
}

function sweep(d: Float64Array, e: Float64Array, l: number, m: number, n: number, rows: Float64Array): void {
  const slope = (d[l + 1]! - d[l]!) / (2 * e[l]!)
  const reach = Math.hypot(slope, 1)
  let g = d[m]! - d[l]! + e[l]! / (slope + (slope < 0 ? -reach : reach))
  let s = 1
  let c = 1
  let p = 0
  for (let i = m - 1; i >= l; i--) {
    const f = s * e[i]!
    const b = c * e[i]!
    const r = Math.hypot(f, g)
    if (i + 1 < m) e[i + 1] = r
    if (r === 0) {
      d[i + 1] = d[i + 1]! - p
      e[m] = 0
      return
    }
    s = f / r
    c = g / r
    const shifted = d[i + 1]! - p
    const t = (d[i]! - shifted) * s + 2 * c * b
    p = s * t
    d[i + 1] = shifted + p
    g = c * t - b
    for (let k = 0, x = i * n, y = x + n; k < n; k++, x++, y++) {
      const upper = rows[y]!
      rows[y] = s * rows[x]! + c * upper
      rows[x] = c * rows[x]! - s * upper
    }
  }
  d[l] = d[l]! - p
  e[l] = g
  if (m < n - 1) e[m] = 0
}
