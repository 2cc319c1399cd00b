import type { Shift, State } from '../regime/regime.ts'

/** Life cycle, terms of ISA-18.2. */
export const alertStates = [
  'unacknowledged',
  'acknowledged',
  'returned-to-normal',
  'shelved',
  'suppressed-by-design',
  'out-of-service',
] as const
export type AlertState = (typeof alertStates)[number]

/** What the pipeline tells the alerts room. */
export type AlertEvent =
  | {
      readonly type: 'shift'
      readonly ensemble: string
      readonly title: string
      readonly shift: Shift
      readonly now: number
    }
  | {
      readonly type: 'steady'
      readonly ensemble: string
      readonly shift: number
      readonly time: number
      readonly now: number
    }
  | { readonly type: 'trial'; readonly now: number }

/** One alert per ensemble and shift. Times in milliseconds since 1970 UTC. */
export interface Alert {
  /** Stable over all versions and routes: `ENSEMBLE/SHIFT/START`, the start as RFC 3339. */
  readonly id: string
  /** Grows by one with every change of the alert. */
  readonly version: number
  readonly ensemble: string
  readonly title: string
  readonly state: AlertState
  /** Set when the regime is steady again. */
  readonly ended: number | null
  readonly trial: boolean
  /** One plain sentence: what changed, since when, who carries it. */
  readonly sentence: string
  /** Numbers and cautions, line by line. */
  readonly details: readonly string[]
  readonly cautions: readonly string[]
  readonly runbook: string | null
  readonly page: string | null
  readonly shift: Shift | null
  readonly raised: number
  /** What made this version. */
  readonly change?: Change
  /** Who has taken note of it, and when. */
  readonly acknowledged?: { readonly by: string; readonly at: number } | null
  /** Set while it calls nobody: shelved, suppressed by design or out of service. */
  readonly withheld?: Withheld | null
}

type ChangeWhat =
  | 'confirmed'
  | 'ended'
  | 'acknowledged'
  | 'shelved'
  | 'suppressed'
  | 'taken-out-of-service'
  | 'returned-to-service'
  | 'trial'

/** `at` is the moment by the wall clock, milliseconds since 1970 UTC. */
export interface Change {
  readonly what: ChangeWhat
  readonly at: number
  /** The person who acted; null where the monitor itself did. */
  readonly by: string | null
  readonly reason: string | null
}

export interface Withheld {
  /** The state to which it returns. */
  readonly before: 'unacknowledged' | 'acknowledged'
  readonly by: string
  readonly reason: string
  /** Shelving ends by itself; the other two by an act. */
  readonly until: number | null
}

/** What a person may do with an alert. Times in milliseconds since 1970 UTC. */
export type Act =
  | { readonly type: 'acknowledge'; readonly by: string }
  | { readonly type: 'shelve'; readonly by: string; readonly reason: string; readonly until: number }
  | { readonly type: 'suppress'; readonly by: string; readonly reason: string }
  | { readonly type: 'take-out-of-service'; readonly by: string; readonly reason: string }
  | { readonly type: 'return-to-service'; readonly by: string }

/** The last word on an ensemble, for heartbeats. */
export interface Pulse {
  readonly ensembles: Readonly<Record<string, State>>
  readonly now: number
}
