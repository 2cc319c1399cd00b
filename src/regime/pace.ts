/** Lengths of runs, in frames, that the states wait for. */
export interface Pace {
  /** Beyond the limit so long before the change is looked at a second time, and again after as long. */
  readonly confirm: number
  /** Near the limit so long before an ensemble is straining. */
  readonly strain: number
  /** Near rest so long before it is steady again. */
  readonly calm: number
  /** Near rest under the old reference so long before the old regime counts as returned. */
  readonly back: number
}

/** A twentieth of the window to confirm, 3 to 30 frames; a quarter to believe in a return. */
export function paceOf(span: number): Pace {
  const confirm = Math.min(30, Math.max(3, Math.ceil(span / 20)))
  return {
    confirm,
    strain: Math.max(3, Math.ceil(span / 50)),
    calm: confirm,
    back: Math.max(confirm, Math.ceil(span / 4)),
  }
}

/** Runs of frames on one side of a threshold. */
export interface Runs {
  readonly beyond: number
  readonly near: number
  readonly calm: number
}

export const noRuns: Runs = { beyond: 0, near: 0, calm: 0 }
export const nearFrom = 0.7
export const calmUnder = 0.5
/** A run beyond the limit ends only below this: a dip to just under the limit keeps it as it is. */
const beyondUntil = 0.9

export const counted = (runs: Runs, ratio: number): Runs => ({
  beyond: ratio >= 1 ? runs.beyond + 1 : ratio >= beyondUntil ? runs.beyond : 0,
  near: ratio >= nearFrom ? runs.near + 1 : 0,
  calm: ratio < calmUnder ? runs.calm + 1 : 0,
})
