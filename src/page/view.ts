import type { AlertState } from '../alerts/alert.ts'
import type { BulkModel } from '../bulk/bulk.ts'
import type { DropCounts, FindingKind } from '../reasons.ts'
import type { ShiftKind, State } from '../regime/regime.ts'

/**
 * What the page is shown, as it travels in JSON: `/state` gives a `PageView`, `/events` a `PageView` first
 * (event `state`) and then a `PageChange` each (event `change`). Times are milliseconds since 1970 UTC; what is not known
 * is null. Types only, shared by server and browser.
 */
export interface PageView {
  /** The monitor's present. */
  readonly now: number
  readonly version: string
  readonly demo: { readonly speed: number | null; readonly note: string } | null
  readonly ensembles: readonly EnsembleView[]
  /** So many points a history holds. */
  readonly mostPoints: number
  /** Those that stand first, then newest first. */
  readonly alerts: readonly AlertView[]
  /** Those that last first, then newest first. */
  readonly findings: readonly FindingView[]
  readonly feeds: readonly FeedView[]
  readonly cautions: readonly string[]
}

/** What has changed since the change before; a list left out is as it was. */
export interface PageChange {
  readonly now: number
  readonly ensembles: readonly EnsembleChange[]
  readonly alerts?: readonly AlertView[]
  readonly findings?: readonly FindingView[]
  readonly feeds?: readonly FeedView[]
}

export interface EnsembleView extends EnsembleNow {
  readonly history: readonly Point[]
}

/** The present values with what has come to the history: `more` points behind it, or the `whole` anew. */
export interface EnsembleChange {
  readonly present: EnsembleNow
  readonly more?: readonly Point[]
  readonly whole?: readonly Point[]
}

/** One judged frame of the history. `limit`: an eigenvalue above it is an escape. */
export type Point = readonly [
  time: number,
  share: number | null,
  first: number | null,
  second: number | null,
  limit: number | null,
  escapes: number | null,
  w2: number | null,
  ceiling: number | null,
  evidence: number | null,
]

export interface Bar {
  readonly signal: string
  readonly share: number
}

export interface EnsembleNow {
  readonly name: string
  readonly title: string
  readonly state: State
  /** Event time from which the state holds; null where it held before this run began. */
  readonly since: number | null
  /** Why the state was entered, in the words of the journal. */
  readonly why: string | null
  readonly learning: { readonly have: number; readonly want: number } | null
  /** Number of the last frame, its end in event time, and when the monitor was seen to have judged it. */
  readonly frame: number | null
  readonly time: number | null
  readonly arrived: number | null
  readonly signals: number
  readonly missing: number
  /** Signals left out of the matrix, the first ones by name. */
  readonly absent: readonly { readonly signal: string; readonly why: string }[]
  readonly absentCount: number
  readonly window: { readonly frames: number; readonly effective: number | null } | null
  readonly share: number | null
  readonly leading: readonly number[]
  readonly edge: {
    readonly model: BulkModel
    readonly lower: number | null
    readonly upper: number | null
    readonly limit: number | null
    readonly level: number | null
    readonly fit: number | null
  } | null
  readonly escapes: readonly { readonly value: number | null; readonly signals: number | null }[]
  readonly distance: {
    readonly w2: number | null
    readonly ceiling: number | null
    readonly rotation: number | null
  } | null
  readonly evidence: {
    readonly ratio: number | null
    readonly statistic: string
    readonly since: number | null
  } | null
  readonly statistics: readonly { readonly statistic: string; readonly ratio: number | null }[]
  readonly sight: number | null
  readonly certificate: number | null
  readonly spectrum: { readonly age: number; readonly bound: number | null } | null
  /** Who leads the present leading mode. */
  readonly leaders: readonly Bar[]
  /** The shift that stands; null unless `shifted`. */
  readonly shift: ShiftView | null
}

export interface ShiftView {
  readonly number: number
  readonly kind: ShiftKind
  readonly start: number
  readonly startFrom: number
  readonly startTo: number
  readonly confirmed: number
  readonly carriers: readonly Bar[]
  /** What makes 1 with the carriers shown: the other signals, and what first order does not explain. */
  readonly remainder: number | null
}

export interface AlertView {
  readonly id: string
  readonly version: number
  readonly ensemble: string
  readonly title: string
  readonly state: AlertState
  readonly trial: boolean
  readonly sentence: string
  readonly details: readonly string[]
  readonly cautions: readonly string[]
  readonly runbook: string | null
  readonly raised: number
  readonly ended: number | null
  readonly acknowledgedBy: string | null
  /** Why it calls nobody, and until when; null where it does call. */
  readonly withheld: { readonly by: string; readonly reason: string; readonly until: number | null } | null
}

export interface FindingView {
  readonly ensemble: string
  readonly signal: string | null
  readonly finding: FindingKind
  readonly from: number
  readonly to: number | null
  readonly detail: string
}

export interface FeedView {
  readonly name: string
  /** null: it has not said so yet. */
  readonly connected: boolean | null
  readonly behind: number | null
  readonly readings: number
  readonly dropped: DropCounts
}
