import { tridiagonalQl } from './tridiagonal-ql.ts'

/** Eigenvalues closer than this, relative to the norm, form a cluster whose vectors are kept orthogonal. */
const clusterWidth = 1e-3
const fewestSteps = 2
const mostSteps = 5
/** Residual of a vector, over the order and the norm, that counts as rounding. */
const roundingSize = 2 * Number.EPSILON

/**
 * Eigenvectors of a symmetric tridiagonal matrix by inverse iteration (Wilkinson 1965; Peters & Wilkinson
 * 1979): the shifted system is factored with partial pivoting, vectors of clustered eigenvalues are
 * orthogonalised against each other. Where that does not reach rounding, QL with vectors takes over. All
 * scratch is kept between calls.
 */
export class TridiagonalVectors {
  #upper0 = new Float64Array(0)
  #upper1 = new Float64Array(0)
  #upper2 = new Float64Array(0)
  #factor = new Float64Array(0)
  #swapped = new Uint8Array(0)
  #fallback: Fallback | null = null

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
    const wanted = roundingSize * n * norm
    let clusterStart = 0
    for (let j = 0; j < k; j++) {
      if (j > 0 && values[j - 1]! - values[j]! > clusterWidth * norm) clusterStart = j
      this.#factorise(diagonal, coupling, n, values[j]!, norm)
      this.#startWith(out, j * stride, j, n)
      this.#orthogonalise(out, stride, clusterStart, j, n)
      let residual = Infinity
      for (let step = 0; step < mostSteps && (step < fewestSteps || !(residual <= wanted)); step++) {
        this.#solve(out, j * stride, n)
        const whole = this.#orthogonalise(out, stride, clusterStart, j, n)
        residual = whole ? residualOf(diagonal, coupling, n, values[j]!, out, j * stride) : Number.NaN
      }
      if (!(residual <= wanted)) {
        return this.#fallBack(diagonal, coupling, n, k, out, stride)
      }
    }
    return true
  }

  #fallBack(
    diagonal: Float64Array,
    coupling: Float64Array,
    n: number,
    k: number,
    out: Float64Array,
    stride: number,
  ): boolean {
    if (this.#fallback === null || this.#fallback.order < n) this.#fallback = fallbackFor(n)
    const { values, couplings, rows, ranks } = this.#fallback
    values.set(diagonal.subarray(0, n))
    couplings.set(coupling.subarray(0, n))
    if (!tridiagonalQl(values, couplings, n, rows)) return false
    const byValue = ranks.subarray(0, n)
    for (let i = 0; i < n; i++) byValue[i] = i
    byValue.sort((a, b) => values[b]! - values[a]!)
    for (let j = 0; j < k; j++) {
      const row = byValue[j]! * n
      out.set(rows.subarray(row, row + n), j * stride)
    }
    return true
  }

  /** A start without symmetry, another for each vector: fractional parts of multiples of the golden ratio. */
  #startWith(out: Float64Array, at: number, j: number, n: number): void {
    for (let i = 0; i < n; i++) {
      const multiple = (i + 1) * (j + 1.5) * 0.6180339887498949
      out[at + i] = multiple - Math.floor(multiple) - 0.5
    }
  }

  /** Takes the earlier vectors of the cluster out of vector j and brings it to norm 1; false when nothing is left. */
  #orthogonalise(out: Float64Array, stride: number, from: number, j: number, n: number): boolean {
    const x = j * stride
    let before = 0
    for (let i = 0; i < n; i++) before = Math.max(before, Math.abs(out[x + i]!))
    if (before === 0) return false
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
    if (length === 0) return false
    for (let i = 0; i < n; i++) out[x + i] = out[x + i]! / length
    return true
  }

  #factorise(d: Float64Array, e: Float64Array, n: number, shift: number, norm: number): void {
    const u0 = this.#upper0
    const u1 = this.#upper1
    const u2 = this.#upper2
    const tiny = Number.EPSILON * norm
    let pivot = d[0]! - shift
    let next = n > 1 ? e[1]! : 0
    for (let i = 0; i < n - 1; i++) {
      const below = e[i + 1]!
      const belowDiagonal = d[i + 1]! - shift
      const belowNext = i + 2 < n ? e[i + 2]! : 0
      if (Math.abs(below) > Math.max(Math.abs(pivot), tiny)) {
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

  #solve(out: Float64Array, at: number, n: number): void {
    for (let i = 0; i < n - 1; i++) {
      const f = this.#factor[i]!
      const here = out[at + i]!
      const below = out[at + i + 1]!
      if (this.#swapped[i] === 1) {
        out[at + i] = below
        out[at + i + 1] = here - f * below
      } else out[at + i + 1] = below - f * here
    }
    let after = 0
    let afterNext = 0
    for (let i = n - 1; i >= 0; i--) {
      const x = (out[at + i]! - this.#upper1[i]! * after - this.#upper2[i]! * afterNext) / this.#upper0[i]!
      out[at + i] = x
      afterNext = after
      after = x
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

interface Fallback {
  readonly order: number
  readonly values: Float64Array
  readonly couplings: Float64Array
  readonly rows: Float64Array
  readonly ranks: Int32Array
}

const fallbackFor = (order: number): Fallback => ({
  order,
  values: new Float64Array(order),
  couplings: new Float64Array(order),
  rows: new Float64Array(order * order),
  ranks: new Int32Array(order),
})

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

/** Largest entry of T x − value x. */
function residualOf(
  diagonal: Float64Array,
  coupling: Float64Array,
  n: number,
  value: number,
  out: Float64Array,
  at: number,
): number {
  let largest = 0
  let spoilt = 0
  for (let i = 0; i < n; i++) {
    let sum = (diagonal[i]! - value) * out[at + i]!
    if (i > 0) sum += coupling[i]! * out[at + i - 1]!
    if (i < n - 1) sum += coupling[i + 1]! * out[at + i + 1]!
    largest = Math.max(largest, Math.abs(sum))
    spoilt += sum - sum
  }
  return spoilt === 0 ? largest : Number.NaN
}
