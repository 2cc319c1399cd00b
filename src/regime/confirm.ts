import type { SymmetricSolver } from '../spectrum/spectrum.ts'
import type { FrameRing } from '../window/frame-ring.ts'
import { type ChangeMode, changeModes, newestHalf } from './change-modes.ts'
import { type ExplicitLimits, strongest, weigh } from './evidence.ts'
import type { Learnt } from './learner.ts'
import { type Reference, referenceFrom } from './reference.ts'
import type { Scale } from './rows.ts'
import { lookAgain, type SecondLook } from './second-look.ts'

/** The newest half of the window must carry this part of its fair share of a departure. */
const newestHalfWanted = 0.5

export interface Doubt {
  /** Frames up to the present one; with a lag they reach back through the lagged window too. */
  readonly ring: FrameRing
  readonly window: { readonly span: number; readonly decay: number | null; readonly effective: number }
  readonly lag: number | null
  /** Roster indices compared. */
  readonly signals: Int32Array
  readonly known: Learnt
  readonly explicit: ExplicitLimits | null
  readonly scale: Scale
  readonly solver: SymmetricSolver
}

export interface Confirmed {
  readonly look: SecondLook
  readonly modes: readonly ChangeMode[]
  /** What the window was held against: with a lag, made from the ring. */
  readonly reference: Reference
}

/**
 * Is a departure that has stood beyond its limit for a run of frames a change? Only if it is still beyond
 * in the second look, and the newest half of the window carries it too: what is on its way out, or shows
 * because something else left, is none. Null when it is not.
 */
export function confirm(d: Doubt): Confirmed | null {
  const { ring, window, known, scale, solver } = d
  const lagged = (lag: number): Reference | undefined =>
    referenceFrom(ring, window.span, lag, solver, scale, new Set(d.signals))?.reference
  const reference = d.lag === null ? known.reference : lagged(d.lag)
  if (reference === undefined) return null
  const look = lookAgain(ring, window, d.signals, reference, known.reference.unevenness, scale, solver)
  if (look === null) return null
  const again = strongest(weigh(look.measures, known.calibration, d.explicit, look.widening))
  if (again === null || again.ratio < 1) return null
  const modes = changeModes(look.matrix, look.base, solver)
  if (modes.length === 0 || newestHalf(look.rows, modes) < newestHalfWanted) return null
  return { look, modes, reference }
}
