const sweepsPerValue = 40

/**
 * Eigenvalues of a symmetric tridiagonal matrix, unordered, in place of `diagonal`; `coupling[i]` joins
 * i − 1 and i and is destroyed. Implicit QL without square roots (Pal, Walker & Kahan; Parlett, The
 * Symmetric Eigenvalue Problem, section 8.15). A coupling of rounding size beside the norm counts as none,
 * so that values are right to rounding of the largest, not each of itself. False when it does not converge.
 */
export function tridiagonalValues(diagonal: Float64Array, coupling: Float64Array, n: number): boolean {
  const d = diagonal
  const e = coupling
  let norm2 = 0
  for (let i = 0; i < n; i++) {
    const square = i + 1 < n ? e[i + 1]! * e[i + 1]! : 0
    e[i] = square
    norm2 = Math.max(norm2, d[i]! * d[i]!, square)
  }
  const none = Number.EPSILON ** 2 * norm2
  let sweeps = 0
  for (let l = 0; l < n; l++) {
    for (;;) {
      let m = l
      while (m < n - 1 && e[m]! > none) m++
      if (m === l) break
      if (m < n - 1) e[m] = 0
      if (++sweeps > sweepsPerValue * n) return false
      if (m === l + 1) splitPair(d, e, l)
      else sweep(d, e, l, m)
    }
  }
  return true
}

/** Both eigenvalues of the 2 × 2 block at l, where sweeps may stand still at the last digit. */
function splitPair(d: Float64Array, e: Float64Array, l: number): void {
  const a = d[l]!
  const c = d[l + 1]!
  const square = e[l]!
  const root = Math.sqrt((a - c) * (a - c) + 4 * square)
  const far = 0.5 * (a + c + (a + c < 0 ? -root : root))
  d[l] = far
  d[l + 1] = far === 0 ? 0 : (Math.abs(a) > Math.abs(c) ? (a / far) * c : (c / far) * a) - square / far
  e[l] = 0
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
