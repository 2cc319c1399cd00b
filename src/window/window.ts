import type { MomentEstimator } from './moment-estimator.ts'

/** A signal must be present in this share of the window to take part in its matrix. */
const presenceWanted = 0.8

/** Why a signal of the roster has no place in the window's matrix. */
export interface Absence {
  readonly index: number
  readonly why: 'missing' | 'constant'
  /** Share of the window's weight in which it is present, 0 to 1. */
  readonly present: number
}

/**
 * The present, as a matrix: the last frames under some weighting. Values are in the frames' unit.
 * Snapshots are structured-clone-able; a restored window goes on bit for bit.
 */
export interface Window {
  /** Takes a frame in; what is too old goes out. Missing entries have `present[i] = 0`. */
  push(x: Float64Array, present: Uint8Array): void
  /** Frames in the window: at most T for a boxcar, all since the start for an exponential memory. */
  readonly frames: number
  /** Is the window as long as it is meant to be? (Exponential: is 95 % of the weight filled?) */
  readonly full: boolean
  /** Frames until it is full, counted from an empty window. */
  readonly span: number
  /** Frames after which nothing of a frame is left (exponential: a weight below rounding). */
  readonly memory: number
  /** Kish's effective number of frames (Σw)²/Σw² (Kish 1965, Survey Sampling). */
  readonly effective: number
  /** a of the exponential memory; null for a boxcar. */
  readonly decay: number | null
  /** Roster indices, ascending, of signals present in at least 80 % of the window and not constant there. */
  active(): Int32Array
  /** The other signals of the roster, each with the reason. */
  absent(): readonly Absence[]
  /** Pearson correlation of `active`, n × n row-major; see MomentEstimator. */
  correlation(out: Float64Array, active: Int32Array): void
  /** Covariance of `active` in fixed scales by roster index; see MomentEstimator. */
  covariance(out: Float64Array, active: Int32Array, scales: Float64Array): void
  /** Standard deviation of signal i in the window, 0 when it is constant or missing. */
  deviation(i: number): number
  /** Pushes between two scheduled rebuilds. */
  readonly rebuildEvery: number
  /** Largest change of a correlation entry found at the last scheduled rebuild; null before the first. */
  readonly drift: number | null
  snapshot(): unknown
  restore(snapshot: unknown): void
}

export function activeOf(moments: MomentEstimator): Int32Array {
  const active: number[] = []
  for (let i = 0; i < moments.size; i++) {
    if (moments.present(i) >= presenceWanted * moments.total && moments.variance(i) > 0) active.push(i)
  }
  return Int32Array.from(active)
}

export function absentOf(moments: MomentEstimator): Absence[] {
  const absent: Absence[] = []
  for (let index = 0; index < moments.size; index++) {
    const present = moments.total > 0 ? moments.present(index) / moments.total : 0
    if (present < presenceWanted) absent.push({ index, why: 'missing', present })
    else if (moments.variance(index) === 0) absent.push({ index, why: 'constant', present })
  }
  return absent
}

/** Largest difference of two correlation matrices of the same signals, entry by entry. */
export function largestChange(before: Float64Array, after: Float64Array): number {
  let largest = 0
  for (let k = 0; k < before.length; k++) largest = Math.max(largest, Math.abs(before[k]! - after[k]!))
  return largest
}
