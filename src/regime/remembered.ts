import { commonPlaces, submatrix } from './reference.ts'

/** A regime that was, by the number of the shift that began it (0: the first). */
export interface RememberedRegime {
  readonly regime: number
  /** Roster indices, ascending. */
  readonly signals: Int32Array
  readonly matrix: Float32Array
}

const mostRegimes = 20
const mostEntries = 8_000_000

/** The list with one regime more; the oldest give way beyond 20, or beyond 32 MB. */
export function remember(
  list: readonly RememberedRegime[],
  regime: number,
  signals: Int32Array,
  matrix: Float64Array,
): RememberedRegime[] {
  const longer = [
    ...list.filter((r) => r.regime !== regime),
    { regime, signals: signals.slice(), matrix: Float32Array.from(matrix) },
  ]
  const most = Math.max(1, Math.min(mostRegimes, Math.floor(mostEntries / matrix.length)))
  return longer.slice(-most)
}

/**
 * Likeness of a matrix to each remembered regime, on the signals that both have, most alike first:
 * tr(AB)/(‖A‖_F‖B‖_F), between 0 and 1 for positive semidefinite matrices, 1 only for proportional ones
 * (the complement of the correlation matrix distance of Herdin, Czink, Özcelik & Bonek 2005).
 */
export function likenesses(
  list: readonly RememberedRegime[],
  signals: Int32Array,
  matrix: Float64Array,
): { readonly regime: number; readonly likeness: number }[] {
  const out = list.map((r) => {
    const here = commonPlaces(signals, r.signals)
    const there = commonPlaces(r.signals, signals)
    const a = submatrix(matrix, signals.length, here)
    const b = submatrix(Float64Array.from(r.matrix), r.signals.length, there)
    let ab = 0
    let aa = 0
    let bb = 0
    for (let k = 0; k < a.length; k++) {
      ab += a[k]! * b[k]!
      aa += a[k]! * a[k]!
      bb += b[k]! * b[k]!
    }
    const whole = Math.sqrt(aa * bb)
    return { regime: r.regime, likeness: whole > 0 ? Math.min(1, Math.max(0, ab / whole)) : 0 }
  })
  return out.sort((p, q) => q.likeness - p.likeness)
}
