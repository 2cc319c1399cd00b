import { failed, ok, type Result, TautlineError } from '../errors.ts'
import { type ExplicitLimits, type StatisticName, statisticNames } from './evidence.ts'
import type { ReferenceRecord } from './reference-record.ts'
import type { Scale } from './rows.ts'

export type ReferenceChoice =
  /** The first so many frames. */
  | { readonly frames: number }
  /** The first so many frames from a time on, milliseconds since 1970 UTC. */
  | { readonly since: number; readonly frames: number }
  /** The window that ended so many frames ago; the observations bring its matrix. */
  | { readonly lagged: number }
  | { readonly from: ReferenceRecord }

export type Limits = { readonly framesPerFalsePage: number } | { readonly explicit: ExplicitLimits }

export interface PlannedChange {
  /** Milliseconds since 1970 UTC; `to` is the first moment after it. */
  readonly from: number
  readonly to: number
  readonly note?: string | undefined
}

export interface WatchOptions {
  /** As the window itself says: `Window.span` and `Window.decay`. */
  readonly window: { readonly span: number; readonly decay: number | null }
  readonly reference: ReferenceChoice
  readonly limits: Limits
  /** Default: correlation. */
  readonly scale?: Scale
  readonly planned?: readonly PlannedChange[]
  /** Seed of the resampling. Default: 1. */
  readonly seed?: number
}

/** Checks limits by name, as they stand in the settings; fails with `limit-unknown`. */
export function readExplicitLimits(limits: Readonly<Record<string, number>>): Result<ExplicitLimits> {
  for (const name of Object.keys(limits)) {
    if (!statisticNames.includes(name as StatisticName)) {
      return failed(new TautlineError('limit-unknown', `It is called "${name}".`))
    }
  }
  return ok(limits)
}
