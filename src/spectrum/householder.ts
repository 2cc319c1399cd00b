/**
 * A sum of squares below this is none: the matrix comes scaled to largest entry about 1, and squares this
 * small have lost their precision.
 */
const vanishing = 1e-280

/** Scratch of `tridiagonalise`: four vectors of at least n entries. */
export interface HouseholderWork {
  readonly v: Float64Array
  readonly w: Float64Array
  readonly x: Float64Array
  readonly p: Float64Array
}

/**
 * Householder reduction of a symmetric matrix to tridiagonal form, the rank-two update of a step fused with
 * the matrix-vector product of the next (Dongarra, Sorensen & Hammarling 1989), two rows a pass.
 *
 * `a` is n × n row-major; its lower triangle is read and overwritten: row i keeps the Householder vector i
 * in its entries 0 … i − 1, `tau[i]` its factor. `diagonal` and `coupling` receive the tridiagonal matrix,
 * `coupling[i]` joining i − 1 and i, `coupling[0] = 0`.
 */
export function tridiagonalise(
  a: Float64Array,
  n: number,
  diagonal: Float64Array,
  coupling: Float64Array,
  tau: Float64Array,
  work: HouseholderWork,
): void {
  let { v, x } = work
  const { w, p } = work
  v.fill(0, 0, n)
  w.fill(0, 0, n)
  coupling[0] = 0
  tau[0] = 0
  for (let i = n - 1; i > 0; i--) {
    const row = i * n
    const vi = v[i]!
    const wi = w[i]!
    let tail = 0
    for (let j = 0; j < i - 1; j++) {
      const entry = a[row + j]! - vi * w[j]! - wi * v[j]!
      x[j] = entry
      tail += entry * entry
    }
    const alpha = a[row + i - 1]! - vi * w[i - 1]! - wi * v[i - 1]!
    diagonal[i] = a[row + i]! - 2 * vi * wi
    let factor = 0
    if (tail < vanishing) {
      coupling[i] = alpha
      x.fill(0, 0, i)
    } else {
      const norm = Math.sqrt(alpha * alpha + tail)
      const beta = alpha > 0 ? -norm : norm
      factor = (beta - alpha) / beta
      const scale = 1 / (alpha - beta)
      for (let j = 0; j < i - 1; j++) x[j] = x[j]! * scale
      coupling[i] = beta
    }
    tau[i] = factor
    x[i - 1] = 1
    for (let j = 0; j < i; j++) a[row + j] = x[j]!
    updateAndMultiply(a, n, i, v, w, x, p)
    let inner = 0
    for (let j = 0; j < i; j++) inner += p[j]! * x[j]!
    const half = -0.5 * factor * factor * inner
    for (let j = 0; j < i; j++) w[j] = half * x[j]! + factor * p[j]!
    const swap = v
    v = x
    x = swap
  }
  if (n > 0) diagonal[0] = a[0]! - 2 * v[0]! * w[0]!
}

/** On the leading m × m lower triangle: A ← A − v wᵀ − w vᵀ and p = A x, in one pass. */
function updateAndMultiply(
  a: Float64Array,
  n: number,
  m: number,
  v: Float64Array,
  w: Float64Array,
  x: Float64Array,
  p: Float64Array,
): void {
  let i = 0
  for (; i + 1 < m; i += 2) {
    const r0 = i * n
    const r1 = r0 + n
    const v0 = v[i]!
    const v1 = v[i + 1]!
    const w0 = w[i]!
    const w1 = w[i + 1]!
    const x0 = x[i]!
    const x1 = x[i + 1]!
    let sum0 = 0
    let sum1 = 0
    for (let j = 0; j < i; j++) {
      const vj = v[j]!
      const wj = w[j]!
      const xj = x[j]!
      const s = a[r0 + j]! - v0 * wj - w0 * vj
      const t = a[r1 + j]! - v1 * wj - w1 * vj
      a[r0 + j] = s
      a[r1 + j] = t
      sum0 += s * xj
      sum1 += t * xj
      p[j] = p[j]! + (s * x0 + t * x1)
    }
    const s00 = a[r0 + i]! - 2 * v0 * w0
    const s10 = a[r1 + i]! - v1 * w0 - w1 * v0
    const s11 = a[r1 + i + 1]! - 2 * v1 * w1
    a[r0 + i] = s00
    a[r1 + i] = s10
    a[r1 + i + 1] = s11
    p[i] = sum0 + s00 * x0 + s10 * x1
    p[i + 1] = sum1 + s10 * x0 + s11 * x1
  }
  if (i < m) {
    const row = i * n
    const vi = v[i]!
    const wi = w[i]!
    const xi = x[i]!
    let sum = 0
    for (let j = 0; j < i; j++) {
      const s = a[row + j]! - vi * w[j]! - wi * v[j]!
      a[row + j] = s
      sum += s * x[j]!
      p[j] = p[j]! + s * xi
    }
    const s = a[row + i]! - 2 * vi * wi
    a[row + i] = s
    p[i] = sum + s * xi
  }
}

/**
 * Vectors of the tridiagonal matrix, `count` rows of `stride` entries, become vectors of the matrix that
 * `tridiagonalise` reduced: v ← (I − τ x xᵀ) v for i = 1 … n − 1.
 */
export function backTransform(
  a: Float64Array,
  n: number,
  tau: Float64Array,
  rows: Float64Array,
  stride: number,
  count: number,
): void {
  for (let i = 1; i < n; i++) {
    const factor = tau[i]!
    if (factor === 0) continue
    const x = i * n
    for (let r = 0; r < count; r++) {
      const v = r * stride
      let inner = 0
      for (let j = 0; j < i; j++) inner += a[x + j]! * rows[v + j]!
      const step = factor * inner
      for (let j = 0; j < i; j++) rows[v + j] = rows[v + j]! - step * a[x + j]!
    }
  }
}
