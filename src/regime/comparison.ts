import type { SymmetricSolver } from '../spectrum/spectrum.ts'
import { type Base, type Measures, measure } from './measures.ts'
import { commonPlaces, type Reference, solvedBase, submatrix } from './reference.ts'
import type { Observation } from './regime.ts'

export interface Comparison {
  readonly measures: Measures
  /** Roster indices compared. */
  readonly signals: Int32Array
  readonly base: Base
  /** Matrix and eigenvalues of the window on these signals. */
  readonly matrix: Float64Array
  readonly values: Float64Array
}

/**
 * Holds windows against a base on the signals that both have. Where that is all of them the observation's
 * own spectrum serves and a frame costs O(n²); otherwise the submatrix is solved anew each frame, and the
 * base's once for each set of signals.
 */
export class Comparer {
  #solver: SymmetricSolver
  #reference: Reference | null = null
  #active: Int32Array = new Int32Array(0)
  #places: Int32Array = new Int32Array(0)
  #base: Base | null = null

  constructor(solver: SymmetricSolver) {
    this.#solver = solver
  }

  /** Null when window and reference have fewer than two signals, or less than half the reference's, in common. */
  against(reference: Reference, o: Observation): Comparison | null {
    if (o.matrix === null || o.spectrum === null) return null
    if (reference !== this.#reference || !same(o.active, this.#active)) this.#prepare(reference, o.active)
    if (this.#base === null) return null
    return this.#compare(o.matrix, o.spectrum.values, o.active, this.#places, this.#base)
  }

  /** The same against the lagged window that the observation brings. */
  againstLagged(o: Observation): Comparison | null {
    const before = o.reference
    if (o.matrix === null || o.spectrum === null || before === null || before === undefined) return null
    const n = o.active.length
    const places = commonPlaces(o.active, before.signals ?? o.active)
    if (places.length < 2) return null
    const whole = places.length === n && before.spectrum.modes > 0
    const base = whole
      ? {
          n,
          matrix: before.matrix,
          values: before.spectrum.values,
          leading: before.spectrum.vectors.subarray(0, n),
        }
      : solvedBase(submatrix(before.matrix, n, places), places.length, this.#solver)
    return this.#compare(o.matrix, o.spectrum.values, o.active, places, base)
  }

  #compare(
    matrix: Float64Array,
    values: Float64Array,
    active: Int32Array,
    places: Int32Array,
    base: Base,
  ): Comparison {
    if (places.length === active.length) {
      return { measures: measure(matrix, values, base), signals: active, base, matrix, values }
    }
    const part = submatrix(matrix, active.length, places)
    const partValues = this.#solver.solve(part, base.n, 0).values.slice(0, base.n)
    return {
      measures: measure(part, partValues, base),
      signals: places.map((a) => active[a]!),
      base,
      matrix: part,
      values: partValues,
    }
  }

  #prepare(reference: Reference, active: Int32Array): void {
    this.#reference = reference
    this.#active = active.slice()
    this.#places = commonPlaces(active, reference.indices)
    const n = this.#places.length
    if (n < 2 || n < reference.n / 2) this.#base = null
    else if (n === reference.n) this.#base = reference
    else {
      const kept = commonPlaces(reference.indices, active)
      this.#base = solvedBase(submatrix(reference.matrix, reference.n, kept), n, this.#solver)
    }
  }
}

const same = (a: Int32Array, b: Int32Array): boolean => a.length === b.length && a.every((v, k) => v === b[k])
