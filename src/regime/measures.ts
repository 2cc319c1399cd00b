/** What a window is held against: a matrix of n signals, its spectrum and its leading mode. */
export interface Base {
  readonly n: number
  /** n × n, row-major. */
  readonly matrix: Float64Array
  /** All n eigenvalues, largest first. */
  readonly values: Float64Array
  /** Unit eigenvector of the largest. */
  readonly leading: Float64Array
}

/** How far a window is from its base. Distances are dimensionless, in units of an eigenvalue. */
export interface Measures {
  readonly n: number
  /** λ1/n now and in the base. */
  readonly share: number
  readonly shareBefore: number
  /** W2 of the two spectra. */
  readonly w2: number
  /** ‖C − C0‖_F/√n, no less than `w2` (Hoffman & Wielandt 1953). */
  readonly ceiling: number
  /**
   * ‖P(C − C0)P‖_F/√n, P the projection off the base's leading mode: the same ceiling without the
   * fluctuation of the market or common mode, which is most of the noise and none of a change of partners.
   */
  readonly partners: number
}

/** `matrix` n × n row-major with its eigenvalues `values`, largest first, both of the base's signals. */
export function measure(matrix: Float64Array, values: Float64Array, base: Base): Measures {
  const n = base.n
  let spectra = 0
  for (let k = 0; k < n; k++) spectra += (values[k]! - base.values[k]!) ** 2
  let whole = 0
  let touched = 0
  let along = 0
  for (let i = 0; i < n; i++) {
    const row = i * n
    let dv = 0
    for (let j = 0; j < n; j++) {
      const d = matrix[row + j]! - base.matrix[row + j]!
      whole += d * d
      dv += d * base.leading[j]!
    }
    touched += dv * dv
    along += base.leading[i]! * dv
  }
  return {
    n,
    share: values[0]! / n,
    shareBefore: base.values[0]! / n,
    w2: Math.sqrt(spectra / n),
    ceiling: Math.sqrt(whole / n),
    partners: Math.sqrt(Math.max(0, whole - 2 * touched + along * along) / n),
  }
}

/** 1 − (w2/ceiling)², in [0, 1]; 0 when the ceiling is 0. */
export const rotationShare = (w2: number, ceiling: number): number =>
  ceiling > 0 ? Math.min(1, Math.max(0, 1 - (w2 / ceiling) ** 2)) : 0
