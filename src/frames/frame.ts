import type { FindingKind } from '../reasons.ts'

/**
 * The increments of all signals of an ensemble at one step of its clock.
 * Arrays have the length of the roster at that moment; the roster only grows, so an index keeps its meaning.
 * A missing signal has `present[i] = 0` and 0 in every array: the 0 is a placeholder, never a value.
 */
export interface Frame {
  /** From 0 at the first closed frame. */
  readonly index: number
  /** End of the step, milliseconds since 1970 UTC (`step: row`: the row's own time). */
  readonly time: number
  readonly present: Uint8Array
  /** How many signals of the roster are missing. */
  readonly missing: number
  /** Increments in the unit of the signal (log-return: dimensionless; difference, level: the signal's unit). */
  readonly increments: Float64Array
  /** After prewhitening, scaling and removal of common volatility, before truncation: what C is made from. */
  readonly scaled: Float64Array
  /** `scaled` after truncation at ±K robust standard deviations: what Ĉ is made from. */
  readonly cleaned: Float64Array
  /** How many entries were clipped in this frame. */
  readonly clipped: number
  /** The common volatility divided out of this frame, relative to the signals' own scales; 1 when kept. */
  readonly volatility: number
}

/** Something wrong with one signal, or with all of them (`signal` null). Times in milliseconds since 1970. */
export interface Finding {
  readonly signal: string | null
  readonly finding: FindingKind
  readonly from: number
  /** null while it lasts. */
  readonly to: number | null
  readonly detail: string
}
