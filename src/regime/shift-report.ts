import type { SymmetricSolver } from '../spectrum/spectrum.ts'
import type { FrameRing } from '../window/frame-ring.ts'
import { type ChangeMode, changeModes, changePoint } from './change-modes.ts'
import type { Comparison } from './comparison.ts'
import { type Calibration, type Reading, strongest } from './evidence.ts'
import { carriersOf, kindOf, noiseFloor } from './kind.ts'
import { rotationShare } from './measures.ts'
import { type Reference, standardised } from './reference.ts'
import type { Observation, Shift } from './regime.ts'
import { likenesses, type RememberedRegime } from './remembered.ts'
import { bounded, matrixOf, range, type Scale } from './rows.ts'
import type { SecondLook } from './second-look.ts'

export interface ShiftFacts {
  readonly number: number
  readonly observation: Observation
  readonly comparison: Comparison
  readonly readings: readonly Reading[]
  readonly look: SecondLook
  readonly modes: readonly ChangeMode[]
  readonly reference: Reference
  readonly learnt: Calibration | null
  readonly ring: FrameRing
  /** Time of the frame `ago` pushes back, milliseconds since 1970. */
  readonly timeOf: (ago: number) => number
  /** How far back the change may have begun, in frames. */
  readonly reach: number
  /** Fewest frames that a start estimate may rest on. */
  readonly least: number
  readonly remembered: readonly RememberedRegime[]
  readonly sight: number
  readonly scale: Scale
  readonly solver: SymmetricSolver
}

/** Everything that is said about a confirmed change, and how many frames lie surely behind its start. */
export function reportShift(f: ShiftFacts): { readonly shift: Shift; readonly framesSince: number } {
  const { comparison, look, observation: o, ring } = f
  const { measures } = comparison
  const noise = noiseFloor(look, f.learnt, o.window.effective, f.reference.frames)
  const kind = kindOf(look, f.readings, f.modes, noise, f.scale)
  const modes = kind === 'partners' ? changeModes(look.matrix, look.base, f.solver, true) : f.modes
  const { carriers, remainder } = carriersOf(look, kind, modes, o.names)
  const count = Math.max(1, Math.min(f.reach, ring.length))
  const rows = bounded(
    standardised(ring, count, 0, look.signals, f.reference.means, f.reference.scales),
    f.reference.spread,
  )
  const point = changePoint(rows, modes, Math.min(f.least, count))
  const since = count - point.at
  const enough = since >= Math.max(16, look.rows.count / 4)
  const now = enough ? matrixOf(rows, range(count, point.at), 'correlation') : look.matrix
  const top = strongest(f.readings)!
  const time = (row: number): number => f.timeOf(count - 1 - row)
  const shift: Shift = {
    number: f.number,
    kind,
    start: time(point.at),
    startFrom: time(point.from),
    startTo: time(point.to),
    confirmed: o.time,
    frame: o.frame,
    carriers,
    remainder,
    shareBefore: measures.shareBefore,
    shareAfter: measures.share,
    distance: {
      w2: measures.w2,
      ceiling: measures.ceiling,
      rotation: rotationShare(measures.w2, measures.ceiling),
    },
    evidence: { statistic: top.statistic, value: top.value, limit: top.limit, ratio: top.ratio },
    certificate: o.certificate,
    sight: f.sight,
    likeness: likenesses(f.remembered, look.signals, now),
    spectrumBefore: [...comparison.base.values],
    spectrumAfter: [...comparison.values.subarray(0, comparison.base.n)],
    statistics: f.readings
      .filter((r) => r.ratio >= 1)
      .map(({ statistic, value, limit }) => ({ statistic, value, limit })),
  }
  return { shift, framesSince: count - point.to }
}
