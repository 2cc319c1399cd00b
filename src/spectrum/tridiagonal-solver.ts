import { powerOfTwoScale } from './lower-triangle.ts'
import { pointUp } from './point-up.ts'
import type { Spectrum, SymmetricSolver } from './spectrum.ts'
import { SpectrumError } from './spectrum-error.ts'
import { TridiagonalVectors } from './tridiagonal-vectors.ts'

/** The O(N³) and O(N²) work of the eigenproblem, wherever it runs. Holds one reduced matrix at a time. */
export interface TridiagonalCore {
  /** Takes the lower triangle in, divided by `scale`, and writes its tridiagonal form out. */
  reduce(matrix: Float64Array, n: number, scale: number, diagonal: Float64Array, coupling: Float64Array): void
  /** Writes the eigenvalues of the reduced matrix out, unordered; false without convergence. */
  values(out: Float64Array, n: number): boolean
  /** Room for `count` vectors as rows of `stride` entries. */
  rows(count: number): { readonly entries: Float64Array; readonly stride: number }
  /** Turns the vectors in `rows` from those of the tridiagonal matrix into those of the matrix. */
  backTransform(count: number): void
}

/**
 * The symmetric eigenproblem by tridiagonal reduction: values by QL, leading vectors by inverse iteration,
 * carried back. Scratch grows with the largest order seen; a call allocates only what it returns.
 */
export class TridiagonalSolver implements SymmetricSolver {
  readonly #core: TridiagonalCore
  readonly #vectors = new TridiagonalVectors()
  #diagonal = new Float64Array(0)
  #coupling = new Float64Array(0)

  constructor(core: TridiagonalCore) {
    this.#core = core
  }

  /**
   * `matrix` n × n row-major, lower triangle read. `modes` leading vectors, cut to 0 … n.
   *
   * @throws SpectrumError when an entry is not finite, an eigenvalue overflows, or an iteration fails
   */
  solve(matrix: Float64Array, n: number, modes: number): Spectrum {
    const scale = powerOfTwoScale(matrix, n)
    const k = Math.max(0, Math.min(Math.floor(modes), n))
    const values = new Float64Array(n)
    const vectors = new Float64Array(k * n)
    if (n > 0) {
      this.#reserve(n)
      this.#core.reduce(matrix, n, scale, this.#diagonal, this.#coupling)
      if (!this.#core.values(values, n)) throw new SpectrumError('not-converged', n)
      values.sort().reverse()
      if (k > 0) this.#leading(values, n, k, vectors)
      for (let i = 0; i < n; i++) values[i] = values[i]! * scale
      if (!Number.isFinite(values[0]!) || !Number.isFinite(values[n - 1]!)) {
        throw new SpectrumError('too-large', n)
      }
    }
    return { n, values, modes: k, vectors, age: 0, bound: 0 }
  }

  #leading(values: Float64Array, n: number, k: number, out: Float64Array): void {
    const { entries, stride } = this.#core.rows(k)
    if (!this.#vectors.compute(this.#diagonal, this.#coupling, n, values, k, entries, stride)) {
      throw new SpectrumError('not-converged', n)
    }
    this.#core.backTransform(k)
    for (let j = 0; j < k; j++) {
      for (let i = 0; i < n; i++) out[j * n + i] = entries[j * stride + i]!
      pointUp(out, j * n, n)
    }
  }

  #reserve(n: number): void {
    if (this.#diagonal.length >= n) return
    this.#diagonal = new Float64Array(n)
    this.#coupling = new Float64Array(n)
  }
}
