import type { SymmetricSolver } from '../spectrum/spectrum.ts'
import type { FrameRing } from '../window/frame-ring.ts'
import { type Base, type Measures, measure } from './measures.ts'
import { commonPlaces, type Reference, solvedBase, standardised, submatrix } from './reference.ts'
import { bounded, matrixOf, type Rows, range, type Scale, unevenness } from './rows.ts'

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
  /** By how much the limits must be wider because loudness swings more in the window than in the reference. */
  readonly widening: number
}

/** A signal whose last so many present entries are one and the same value has nothing to say about partners. */
const stillFor = (span: number): number => Math.max(10, Math.ceil(span / 10))

/**
 * Before a change is called it must also be there when every frame is bounded in loudness on both sides
 * (see `bounded`) and signals that have stood still lately are left out. What one crash day, a flash print
 * or a burst of volatility does to a window, on entering or on leaving it, does not survive this; what many
 * frames say does. Where loudness swings more than it did in the reference, the limits are widened with the
 * scatter of the matrix. `ring` ends with the present frame;
 * `usual` is the unevenness with which the limits were learnt. Null when fewer than two signals are left.
 */
export function lookAgain(
  ring: FrameRing,
  window: { readonly span: number; readonly decay: number | null; readonly effective: number },
  signals: Int32Array,
  reference: Reference,
  usual: number,
  scale: Scale,
  solver: SymmetricSolver,
): SecondLook | null {
  const { span, decay } = window
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
  const solved = solvedBase(matrix, n, solver)
  const base = solvedBase(submatrix(reference.bounded, reference.n, places), n, solver)
  const now = [unevenness(rows, base.leading, decay), reference.unevenness]
  const parts = [1 / window.effective, 1 / reference.frames]
  const scatter = (now[0]! * parts[0]! + now[1]! * parts[1]!) / (usual * (parts[0]! + parts[1]!))
  return {
    signals: kept,
    base,
    matrix,
    values: solved.values,
    vectors: solved.vectors,
    measures: measure(matrix, solved.values, base),
    rows,
    widening: Math.sqrt(Math.max(1, scatter)),
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
