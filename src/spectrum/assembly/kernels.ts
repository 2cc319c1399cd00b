// Kernels of the symmetric eigenproblem for WebAssembly with 128-bit SIMD (AssemblyScript).
// Pointers are byte offsets into the shared memory. A matrix has `ld` entries a row, ld a multiple of 4;
// what lies beyond its order n holds zeros. Built by `npm run kernels`.

// @ts-ignore: decorator
@inline function pair(p: usize): v128 {
  return v128.load(p)
}
// @ts-ignore: decorator
@inline function put(p: usize, v: v128): void {
  v128.store(p, v)
}
// @ts-ignore: decorator
@inline function both(x: f64): v128 {
  return f64x2.splat(x)
}
// @ts-ignore: decorator
@inline function plus(a: v128, b: v128, c: v128): v128 {
  return f64x2.add(c, f64x2.mul(a, b))
}
// @ts-ignore: decorator
@inline function minus(a: v128, b: v128, c: v128): v128 {
  return f64x2.sub(c, f64x2.mul(a, b))
}
// @ts-ignore: decorator
@inline function lanes(v: v128): f64 {
  return f64x2.extract_lane(v, 0) + f64x2.extract_lane(v, 1)
}
// @ts-ignore: decorator
@inline function at(p: usize, i: i32): f64 {
  return load<f64>(p + ((<usize>i) << 3))
}
// @ts-ignore: decorator
@inline function set(p: usize, i: i32, x: f64): void {
  store<f64>(p + ((<usize>i) << 3), x)
}
// @ts-ignore: decorator
@inline function bytes(n: i32): usize {
  return (<usize>n) << 3
}
// @ts-ignore: decorator
@inline function padded(n: i32): i32 {
  return (n + 3) & ~3
}

// Inner product of two vectors of n entries whose pads up to a multiple of 4 hold zeros.
function dot(a: usize, b: usize, n: i32): f64 {
  let s = both(0)
  let t = both(0)
  const end = bytes(padded(n))
  for (let j: usize = 0; j < end; j += 32) {
    s = plus(pair(a + j), pair(b + j), s)
    t = plus(v128.load(a + j, 16), v128.load(b + j, 16), t)
  }
  return lanes(f64x2.add(s, t))
}

// One pass over the leading m × m lower triangle: A ← A − v wᵀ − w vᵀ and p = A x. The 2 × 2 blocks on the
// diagonal are kept full.
function updateAndMultiply(A: usize, ld: usize, m: i32, v: usize, w: usize, x: usize, p: usize): void {
  const mp = padded(m)
  memory.fill(p, 0, bytes(mp))
  for (let i = 0; i < mp; i += 2) {
    const r0 = A + <usize>i * ld
    const r1 = r0 + ld
    const v0 = both(at(v, i))
    const v1 = both(at(v, i + 1))
    const w0 = both(at(w, i))
    const w1 = both(at(w, i + 1))
    const x0 = both(at(x, i))
    const x1 = both(at(x, i + 1))
    let a0 = both(0)
    let a1 = both(0)
    const end = bytes(i)
    for (let j: usize = 0; j < end; j += 16) {
      const vj = pair(v + j)
      const wj = pair(w + j)
      const xj = pair(x + j)
      const s = minus(v0, wj, minus(w0, vj, pair(r0 + j)))
      put(r0 + j, s)
      a0 = plus(s, xj, a0)
      const t = minus(v1, wj, minus(w1, vj, pair(r1 + j)))
      put(r1 + j, t)
      a1 = plus(t, xj, a1)
      put(p + j, plus(t, x1, plus(s, x0, pair(p + j))))
    }
    const vj = pair(v + end)
    const wj = pair(w + end)
    const xj = pair(x + end)
    const s = minus(v0, wj, minus(w0, vj, pair(r0 + end)))
    put(r0 + end, s)
    const t = minus(v1, wj, minus(w1, vj, pair(r1 + end)))
    put(r1 + end, t)
    set(p, i, at(p, i) + lanes(plus(s, xj, a0)))
    set(p, i + 1, at(p, i + 1) + lanes(plus(t, xj, a1)))
  }
}

// Householder reduction of the symmetric A (order n, ld entries a row; the lower triangle is read, the 2 × 2
// diagonal blocks must be full) to tridiagonal form with diagonal d[0..n-1] and couplings e[1..n-1], the
// update fused with the next matrix-vector product (Dongarra, Sorensen & Hammarling 1989, arranged for one
// pass). Row i of A keeps the Householder vector i (entries 0..i-1), tau[i] its factor. work: 4·ld entries.
export function tridiagonalise(A: usize, n: i32, ldEntries: i32, d: usize, e: usize, tau: usize, work: usize): void {
  const ld = bytes(ldEntries)
  memory.fill(work, 0, 4 * ld)
  let v = work
  const w = work + ld
  let x = work + 2 * ld
  const p = work + 3 * ld
  set(e, 0, 0)
  set(tau, 0, 0)
  for (let i = n - 1; i > 0; i--) {
    const row = A + <usize>i * ld
    const vi = both(at(v, i))
    const wi = both(at(w, i))
    const rowEnd = bytes(padded(i + 1))
    for (let j: usize = 0; j < rowEnd; j += 16) {
      put(row + j, minus(vi, pair(w + j), minus(wi, pair(v + j), pair(row + j))))
    }
    set(d, i, at(row, i))
    set(v, i, 0)
    set(w, i, 0)
    memory.copy(x, row, bytes(i))
    for (let j = i; j < padded(i) + 4 && j < ldEntries; j++) set(x, j, 0)
    const alpha = at(x, i - 1)
    set(x, i - 1, 0)
    const tail = dot(x, x, i)
    let t = 0.0
    // squares this small have lost their precision; the matrix comes scaled to largest entry about 1
    if (tail < 1e-280) {
      set(e, i, alpha)
      memory.fill(x, 0, bytes(i))
    } else {
      const norm = Math.sqrt(alpha * alpha + tail)
      const beta = alpha > 0 ? -norm : norm
      t = (beta - alpha) / beta
      const scale = both(1.0 / (alpha - beta))
      const end = bytes(padded(i))
      for (let j: usize = 0; j < end; j += 16) put(x + j, f64x2.mul(pair(x + j), scale))
      set(e, i, beta)
    }
    set(tau, i, t)
    set(x, i - 1, 1)
    memory.copy(row, x, bytes(i))
    if (i == 1) {
      set(d, 0, at(A, 0) - 2 * at(v, 0) * at(w, 0))
      return
    }
    updateAndMultiply(A, ld, i, v, w, x, p)
    for (let j = i; j < padded(i); j++) set(p, j, 0)
    const half = -0.5 * t * t * dot(p, x, i)
    const tt = both(t)
    const hh = both(half)
    const end = bytes(padded(i))
    for (let j: usize = 0; j < end; j += 16) put(w + j, plus(hh, pair(x + j), f64x2.mul(tt, pair(p + j))))
    const swap = v
    v = x
    x = swap
  }
  set(d, 0, at(A, 0))
}

// Eigenvalues of the tridiagonal matrix, unordered, in d. Square-root-free implicit QL of Pal, Walker and
// Kahan (Parlett, The Symmetric Eigenvalue Problem, 8.15), the two divisions of a step made independent.
// e[i] couples i-1 and i on entry and is destroyed. Gives the number of sweeps, or -1 without convergence.
export function eigenvalues(d: usize, e: usize, n: i32): i32 {
  const eps = 2.220446049250313e-16
  let norm2 = 0.0
  for (let i = 0; i < n; i++) {
    const c = i + 1 < n ? at(e, i + 1) : 0.0
    const square = c * c
    set(e, i, square)
    norm2 = Math.max(norm2, Math.max(at(d, i) * at(d, i), square))
  }
  // a coupling of rounding size beside the norm counts as none
  const none = eps * eps * norm2
  let sweeps = 0
  for (let l = 0; l < n; l++) {
    for (;;) {
      let m = l
      while (m < n - 1 && at(e, m) > none) m++
      if (m == l) break
      if (m < n - 1) set(e, m, 0)
      if (++sweeps > 40 * n) return -1
      if (m == l + 1) {
        // both eigenvalues of a 2 x 2 block, where sweeps may stand still at the last digit
        const a = at(d, l)
        const b = at(d, m)
        const square = at(e, l)
        const width = Math.sqrt((a - b) * (a - b) + 4 * square)
        const far = 0.5 * (a + b + (a + b < 0 ? -width : width))
        set(d, l, far)
        set(d, m, far == 0 ? 0 : (Math.abs(a) > Math.abs(b) ? (a / far) * b : (b / far) * a) - square / far)
        set(e, l, 0)
        break
      }
      let p = at(d, l)
      const root = Math.sqrt(at(e, l))
      let sigma = (at(d, l + 1) - p) / (2 * root)
      let r = Math.sqrt(sigma * sigma + 1)
      sigma = p - root / (sigma + (sigma < 0 ? -r : r))
      let s = 0.0
      let c = 1.0
      let gamma = at(d, m) - sigma
      p = gamma * gamma
      for (let i = m - 1; i >= l; i--) {
        const square = at(e, i)
        const shifted = at(d, i) - sigma
        r = p + square
        if (i != m - 1) set(e, i + 1, s * r)
        const before = c
        const inverse = 1.0 / r
        const ratio = r / p
        c = p * inverse
        s = square * inverse
        const old = gamma
        gamma = c * shifted - s * old
        set(d, i + 1, old + (shifted + sigma - gamma))
        p = p > 1e-290 ? gamma * gamma * ratio : c != 0 ? (gamma * gamma) / c : before * square
      }
      set(e, l, s * p)
      set(d, l, sigma + gamma)
    }
  }
  return sweeps
}

// Vectors of the tridiagonal matrix (k rows of ld entries, pads zero) become vectors of A, by the Householder
// vectors that `tridiagonalise` left in the rows of A: v ← (I − τ x xᵀ) v for i = 1 … n − 1.
export function backTransform(A: usize, n: i32, ldEntries: i32, tau: usize, V: usize, k: i32): void {
  const ld = bytes(ldEntries)
  for (let i = 1; i < n; i++) {
    const t = at(tau, i)
    if (t == 0) continue
    const x = A + <usize>i * ld
    const count = padded(i)
    for (let j = i; j < count; j++) set(x, j, 0)
    const end = bytes(count)
    for (let r = 0; r < k; r++) {
      const v = V + <usize>r * ld
      const factor = both(t * dot(x, v, i))
      for (let j: usize = 0; j < end; j += 16) put(v + j, minus(factor, pair(x + j), pair(v + j)))
    }
  }
}
