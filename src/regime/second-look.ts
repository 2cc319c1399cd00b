import type { SymmetricSolver } from '../spectrum/spectrum.ts'
import type { FrameRing } from '../window/frame-ring.ts'
import { type Base, type Measures, measure } from './measures.ts'
import { commonPlaces, type Reference, solvedBase, standardised, submatrix } from './reference.ts'
import { bounded, matrixOf, type Rows, range, type Scale } from './rows.ts'

/** Window and reference as they look when no frame may be loud and no signal stands still. */
export interface SecondLook {
  /** Roster indices of the signals compared. */
  readonly signals: Int32Array
  readonly base: Base & { readonly vectors: Float64Array }
  readonly matrix: Float64Array
  readonly values: Float64Array
  readonly vectors: Float64Array
  readonly measures: Measures
  /** The window's frames, standardised by the reference, oldest first, none too loud. */
  readonly rows: Rows
}

/** A signal whose last so many present entries are one and the same value has nothing to say about partners. */
const stillFor = (span: number): number => Math.max(10, Math.ceil(span / 10))

/**
 * Before a change is called it must also be there when every frame is bounded in loudness on both sides
 * (see `bounded`) and signals that have stood still lately are left out. What one crash day, a flash print
 * or a burst of volatility does to a window, on entering or on leaving it, does not survive this; what many
 * frames say does. `ring` ends with the present frame. Null when fewer than two signals are left.
 */
export function lookAgain(
  ring: FrameRing,
  span: number,
  decay: number | null,
  signals: Int32Array,
  reference: Reference,
  scale: Scale,
  solver: SymmetricSolver,
): SecondLook | null {
  const moving = signals.filter((i) => !standsStill(ring, i, stillFor(span)))
  const places = commonPlaces(reference.indices, moving)
  const n = places.length
  if (n < 2) return null
  const kept = places.map((a) => reference.indices[a]!)
  const count = Math.min(span, ring.length)
  const rows = bounded(
    standardised(ring, count, 0, kept, reference.means, reference.scales),
    reference.spread,
  )
  const matrix = matrixOf(rows, range(count), scale, decay)
  const now = solvedBase(matrix, n, solver)
  const base = solvedBase(submatrix(reference.bounded, reference.n, places), n, solver)
  return {
    signals: kept,
    base,
    matrix,
    values: now.values,
    vectors: now.vectors,
    measures: measure(matrix, now.values, base),
    rows,
  }
}

function standsStill(ring: FrameRing, signal: number, wanted: number): boolean {
  let seen = 0
  let value = 0
  for (let ago = 0; ago < ring.length && seen < wanted; ago++) {
    if (ring.present(ago)[signal] !== 1) continue
    const x = ring.values(ago)[signal]!
    if (seen > 0 && x !== value) return false
    value = x
    seen++
  }
  return seen >= wanted
}
