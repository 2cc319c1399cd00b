/** Eigenvalues closer than this, relative to the norm, form a cluster whose vectors are kept orthogonal. */
const clusterWidth = 1e-3
const mostSteps = 5
const mostStarts = 4
/** A vector whose solve has grown by this over the norm has a residual of its inverse: the least accepted. */
const leastGrowth = 1e10

/**
 * Eigenvectors of a symmetric tridiagonal matrix by inverse iteration (Wilkinson 1965; Peters & Wilkinson
 * 1979): the shifted system is factored with partial pivoting, vectors of clustered eigenvalues are
 * orthogonalised against each other. All scratch is kept between calls.
 */
export class TridiagonalVectors {
  #upper0 = new Float64Array(0)
  #upper1 = new Float64Array(0)
  #upper2 = new Float64Array(0)
  #factor = new Float64Array(0)
  #swapped = new Uint8Array(0)

  /**
   * `diagonal` has n entries, `coupling[i]` joins i − 1 and i (coupling[0] unused). Writes the vectors of
   * `values[0 … k − 1]`, largest first, as rows of `stride` entries into `out`; each has unit norm. False
   * when one cannot be had.
   */
  compute(
    diagonal: Float64Array,
    coupling: Float64Array,
    n: number,
    values: Float64Array,
    k: number,
    out: Float64Array,
    stride: number,
  ): boolean {
    this.#reserve(n)
    const norm = normOf(diagonal, coupling, n)
    let clusterStart = 0
    for (let j = 0; j < k; j++) {
      if (j > 0 && values[j - 1]! - values[j]! > clusterWidth * norm) clusterStart = j
      this.#factorise(diagonal, coupling, n, values[j]!, norm)
      let growth = 0
      for (let start = 0; start < mostStarts && !(growth >= leastGrowth / norm); start++) {
        growth = this.#iterate(out, stride, clusterStart, j, n, norm, start)
      }
      if (!(growth >= leastGrowth / norm)) return false
    }
    return true
  }

  /** Inverse iteration for vector j; gives the last growth of its norm in a solve. */
  #iterate(
    out: Float64Array,
    stride: number,
    clusterStart: number,
    j: number,
    n: number,
    norm: number,
    start: number,
  ): number {
    const x = out.subarray(j * stride, j * stride + n)
    for (let i = 0; i < n; i++) x[i] = startEntry(i, j + start * n)
    this.#orthogonalise(out, stride, clusterStart, j, n)
    let growth = 0
    for (let step = 0; step < mostSteps; step++) {
      this.#solve(x, n)
      growth = this.#orthogonalise(out, stride, clusterStart, j, n)
      if (step > 0 && growth > 0.01 / (Number.EPSILON * n * norm)) break
    }
    return growth
  }

  /** Takes the earlier vectors of the cluster out of vector j and brings it to norm 1; gives its norm before. */
  #orthogonalise(out: Float64Array, stride: number, from: number, j: number, n: number): number {
    const x = j * stride
    let before = 0
    for (let i = 0; i < n; i++) before = Math.max(before, Math.abs(out[x + i]!))
    if (before === 0) return 0
    for (let i = 0; i < n; i++) out[x + i] = out[x + i]! / before
    for (let pass = 0; pass < 2; pass++) {
      for (let c = from; c < j; c++) {
        const y = c * stride
        let inner = 0
        for (let i = 0; i < n; i++) inner += out[x + i]! * out[y + i]!
        for (let i = 0; i < n; i++) out[x + i] = out[x + i]! - inner * out[y + i]!
      }
    }
    let square = 0
    for (let i = 0; i < n; i++) square += out[x + i]! * out[x + i]!
    const length = Math.sqrt(square)
    if (length === 0) return 0
    for (let i = 0; i < n; i++) out[x + i] = out[x + i]! / length
    return before * length
  }

  #factorise(d: Float64Array, e: Float64Array, n: number, shift: number, norm: number): void {
    const u0 = this.#upper0
    const u1 = this.#upper1
    const u2 = this.#upper2
    const tiny = Math.max(Number.EPSILON * norm, 1e-290)
    let pivot = d[0]! - shift
    let next = n > 1 ? e[1]! : 0
    for (let i = 0; i < n - 1; i++) {
      const below = e[i + 1]!
      const belowDiagonal = d[i + 1]! - shift
      const belowNext = i + 2 < n ? e[i + 2]! : 0
      if (Math.abs(below) > Math.abs(pivot)) {
        const f = pivot / below
        u0[i] = below
        u1[i] = belowDiagonal
        u2[i] = belowNext
        this.#factor[i] = f
        this.#swapped[i] = 1
        pivot = next - f * belowDiagonal
        next = -f * belowNext
      } else {
        const safe = Math.abs(pivot) < tiny ? tiny : pivot
        const f = below / safe
        u0[i] = safe
        u1[i] = next
        u2[i] = 0
        this.#factor[i] = f
        this.#swapped[i] = 0
        pivot = belowDiagonal - f * next
        next = belowNext
      }
    }
    u0[n - 1] = Math.abs(pivot) < tiny ? tiny : pivot
    u1[n - 1] = 0
    u2[n - 1] = 0
  }

  #solve(x: Float64Array, n: number): void {
    for (let i = 0; i < n - 1; i++) {
      const f = this.#factor[i]!
      if (this.#swapped[i] === 1) {
        const below = x[i + 1]!
        x[i + 1] = x[i]! - f * below
        x[i] = below
      } else x[i + 1] = x[i + 1]! - f * x[i]!
    }
    for (let i = n - 1; i >= 0; i--) {
      let sum = x[i]!
      if (i + 1 < n) sum -= this.#upper1[i]! * x[i + 1]!
      if (i + 2 < n) sum -= this.#upper2[i]! * x[i + 2]!
      x[i] = sum / this.#upper0[i]!
    }
  }

  #reserve(n: number): void {
    if (this.#upper0.length >= n) return
    this.#upper0 = new Float64Array(n)
    this.#upper1 = new Float64Array(n)
    this.#upper2 = new Float64Array(n)
    this.#factor = new Float64Array(n)
    this.#swapped = new Uint8Array(n)
  }
}

/** Largest absolute row sum; 1 for a zero matrix. */
function normOf(diagonal: Float64Array, coupling: Float64Array, n: number): number {
  let norm = 0
  for (let i = 0; i < n; i++) {
    const left = i > 0 ? Math.abs(coupling[i]!) : 0
    const right = i < n - 1 ? Math.abs(coupling[i + 1]!) : 0
    norm = Math.max(norm, Math.abs(diagonal[i]!) + left + right)
  }
  return norm > 0 ? norm : 1
}

/** A start without symmetry, another for each vector: fractional parts of multiples of the golden ratio. */
function startEntry(i: number, j: number): number {
  const multiple = (i + 1) * (j + 1.5) * 0.6180339887498949
  return multiple - Math.floor(multiple) - 0.5
}
