import { backTransform, type HouseholderWork, tridiagonalise } from './householder.ts'
import { type TridiagonalCore, TridiagonalSolver } from './tridiagonal-solver.ts'
import { tridiagonalValues } from './tridiagonal-values.ts'

/** The symmetric eigenproblem in plain TypeScript, for every engine. */
export class PlainSolver extends TridiagonalSolver {
  constructor() {
    super(new PlainCore())
  }
}

class PlainCore implements TridiagonalCore {
  #order = 0
  #matrix = new Float64Array(0)
  #diagonal = new Float64Array(0)
  #coupling = new Float64Array(0)
  #tau = new Float64Array(0)
  #work: HouseholderWork = workFor(0)
  #rows = new Float64Array(0)

  reduce(
    matrix: Float64Array,
    n: number,
    scale: number,
    diagonal: Float64Array,
    coupling: Float64Array,
  ): void {
    this.#reserve(n)
    const a = this.#matrix
    for (let i = 0; i < n; i++) {
      const row = i * n
      if (scale === 1) for (let j = 0; j <= i; j++) a[row + j] = matrix[row + j]!
      else for (let j = 0; j <= i; j++) a[row + j] = matrix[row + j]! / scale
    }
    tridiagonalise(a, n, diagonal, coupling, this.#tau, this.#work)
    for (let i = 0; i < n; i++) {
      this.#diagonal[i] = diagonal[i]!
      this.#coupling[i] = coupling[i]!
    }
  }

  values(out: Float64Array, n: number): boolean {
    const converged = tridiagonalValues(this.#diagonal, this.#coupling, n)
    for (let i = 0; i < n; i++) out[i] = this.#diagonal[i]!
    return converged
  }

  rows(count: number): { entries: Float64Array; stride: number } {
    const wanted = count * this.#order
    if (this.#rows.length < wanted) this.#rows = new Float64Array(wanted)
    return { entries: this.#rows, stride: this.#order }
  }

  backTransform(count: number): void {
    backTransform(this.#matrix, this.#order, this.#tau, this.#rows, this.#order, count)
  }

  #reserve(n: number): void {
    this.#order = n
    if (this.#tau.length >= n) return
    this.#matrix = new Float64Array(n * n)
    this.#diagonal = new Float64Array(n)
    this.#coupling = new Float64Array(n)
    this.#tau = new Float64Array(n)
    this.#work = workFor(n)
  }
}

function workFor(n: number): HouseholderWork {
  return {
    v: new Float64Array(n),
    w: new Float64Array(n),
    x: new Float64Array(n),
    p: new Float64Array(n),
  }
}
