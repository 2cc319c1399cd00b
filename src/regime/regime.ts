import type { Bulk } from '../bulk/bulk.ts'
import type { Spectrum } from '../spectrum/spectrum.ts'

export const states = ['learning', 'steady', 'straining', 'shifted'] as const
export type State = (typeof states)[number]

export const shiftKinds = ['strength', 'partners', 'amplitude', 'one-signal'] as const
export type ShiftKind = (typeof shiftKinds)[number]

/** What the regime room is shown of one frame. Arrays are borrowed: copy what must outlive the call. */
export interface Observation {
  readonly frame: number
  /** Milliseconds since 1970 UTC. */
  readonly time: number
  /** Names of the roster, index by index. */
  readonly names: readonly string[]
  /** Cleaned values of the frame, roster length; see Frame. */
  readonly cleaned: Float64Array
  readonly present: Uint8Array
  /** Roster indices of the signals that take part in the matrix, ascending; n of them. */
  readonly active: Int32Array
  /** Correlation (or covariance in reference scale) of the window, n × n row-major; null until it is full. */
  readonly matrix: Float64Array | null
  readonly spectrum: Spectrum | null
  readonly bulk: Bulk | null
  readonly window: { readonly frames: number; readonly effective: number }
  readonly certificate: number | null
  /**
   * With `reference: { lagged }`: matrix and spectrum of the signals `active` in the window that ended so
   * many frames ago, null until it is full. `signals`: which of them took part in that window (left out:
   * all); the others are not compared. Left out altogether for every other kind of reference.
   */
  readonly reference?: {
    readonly matrix: Float64Array
    readonly spectrum: Spectrum
    readonly signals?: Int32Array
  } | null
}

export interface Distance {
  /** W2 between the spectra of the window and of the reference. */
  readonly w2: number
  /** ‖C − C0‖_F/√n. */
  readonly ceiling: number
  /** 1 − (w2/ceiling)², in [0, 1]; 0 when ceiling is 0. */
  readonly rotation: number
}

export interface Evidence {
  /**
   * Evidence over its limit; 1 and more is beyond it. Where the statistic's level at rest is known, both
   * are counted from there, so that rest is near 0.
   */
  readonly ratio: number
  /** Name of the statistic that carries it, kebab-case. */
  readonly statistic: string
  /** When this evidence began to gather, milliseconds since 1970; null at rest. */
  readonly since: number | null
}

export interface Carrier {
  readonly signal: string
  /** Its part of the first-order movement of the leading (or new) mode; the shares and `remainder` add up to 1. */
  readonly share: number
}

/** A confirmed change of regime. All times in milliseconds since 1970 UTC. */
export interface Shift {
  readonly number: number
  readonly kind: ShiftKind
  readonly start: number
  readonly startFrom: number
  readonly startTo: number
  readonly confirmed: number
  readonly frame: number
  readonly carriers: readonly Carrier[]
  readonly remainder: number
  readonly shareBefore: number
  readonly shareAfter: number
  readonly distance: Distance
  readonly evidence: {
    readonly statistic: string
    readonly value: number
    readonly limit: number
    readonly ratio: number
  }
  readonly certificate: number | null
  readonly sight: number
  /** Likeness (0 to 1) to earlier regimes, most alike first. */
  readonly likeness: readonly { readonly regime: number; readonly likeness: number }[]
  /** Spectra before and after, largest first, for `explain`. */
  readonly spectrumBefore: readonly number[]
  readonly spectrumAfter: readonly number[]
  /** Which statistics were beyond their limits, with value and limit. */
  readonly statistics: readonly {
    readonly statistic: string
    readonly value: number
    readonly limit: number
  }[]
}

/** One line of the journal of regimes. */
export interface Transition {
  readonly time: number
  readonly frame: number
  readonly from: State
  readonly to: State
  readonly why: string
  readonly shift: number | null
}

export interface Verdict {
  readonly state: State
  /** While a reference is being learnt (also anew, after a shift): frames had, of how many wanted. */
  readonly learning: { readonly have: number; readonly want: number } | null
  readonly distance: Distance | null
  readonly evidence: Evidence | null
  /** Evidence ratio of each statistic, for the metrics and the page. */
  readonly statistics: Readonly<Record<string, number>>
  /** Smallest population eigenvalue that can be seen: 1 + √q in units of the noise variance. */
  readonly sight: number | null
  /** Set in the frame in which a shift is confirmed. */
  readonly shift: Shift | null
  /** Set in the frame in which the ensemble is steady again: number of the shift that ended. */
  readonly ended: number | null
  readonly transitions: readonly Transition[]
  /** Largest signals of the present leading mode, by squared loading; at most ten. */
  readonly leaders: readonly Carrier[]
}

/**
 * The decision, behind one interface: whatever bank of statistics stands behind it, the house shows it
 * observations and reads verdicts. `snapshot` gives structured-clone-able state; `restore` takes it back
 * and the run goes on bit for bit.
 */
export interface RegimeWatch {
  push(observation: Observation): Verdict
  snapshot(): unknown
  restore(snapshot: unknown): void
}
