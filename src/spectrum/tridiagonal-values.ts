const epsilon2 = (Number.EPSILON / 2) ** 2
/** A squared coupling below this is none: the matrix comes scaled to largest entry about 1. */
const vanishing = 1e-290
const sweepsPerValue = 40

/**
 * Eigenvalues of a symmetric tridiagonal matrix, unordered, in place of `diagonal`; `coupling[i]` joins
 * i − 1 and i and is destroyed. Implicit QL without square roots (Pal, Walker & Kahan; Parlett, The
 * Symmetric Eigenvalue Problem, section 8.15). False when it does not converge.
 */
export function tridiagonalValues(diagonal: Float64Array, coupling: Float64Array, n: number): boolean {
  const d = diagonal
  const e = coupling
  for (let i = 1; i < n; i++) e[i - 1] = e[i]! * e[i]!
  if (n > 0) e[n - 1] = 0
  let sweeps = 0
  for (let l = 0; l < n; l++) {
    for (;;) {
      let m = l
      while (m < n - 1 && e[m]! > epsilon2 * Math.abs(d[m]! * d[m + 1]!) && e[m]! >= vanishing) m++
      if (m === l) break
      if (m < n - 1) e[m] = 0
      if (++sweeps > sweepsPerValue * n) return false
      sweep(d, e, l, m)
    }
  }
  return true
}

/** One QL sweep over the unreduced block l … m. */
function sweep(d: Float64Array, e: Float64Array, l: number, m: number): void {
  const first = d[l]!
  const root = Math.sqrt(e[l]!)
  const slope = (d[l + 1]! - first) / (2 * root)
  const reach = Math.sqrt(slope * slope + 1)
  const sigma = first - root / (slope + (slope < 0 ? -reach : reach))
  let s = 0
  let c = 1
  let gamma = d[m]! - sigma
  let p = gamma * gamma
  for (let i = m - 1; i >= l; i--) {
    const square = e[i]!
    const r = p + square
    if (i !== m - 1) e[i + 1] = s * r
    const before = c
    c = p / r
    s = square / r
    const old = gamma
    const alpha = d[i]!
    gamma = c * (alpha - sigma) - s * old
    d[i + 1] = old + (alpha - gamma)
    p = c !== 0 ? (gamma * gamma) / c : before * square
  }
  e[l] = s * p
  d[l] = sigma + gamma
}
