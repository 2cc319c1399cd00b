import type { Delivery, Store } from '../store/store.ts'
import type { Alert } from './alert.ts'
import type { Backoff } from './backoff.ts'
import type { Log, Route } from './route.ts'

/** What became of one try; counted under `tautline_alert_deliveries_total{route,outcome}`. */
export interface DeliveryReport {
  readonly route: string
  readonly what: 'alert' | 'repetition' | 'heartbeat'
  readonly outcome: 'delivered' | 'failed' | 'given-up'
  readonly detail: string
}

export interface DispatcherParts {
  readonly store: Pick<
    Store,
    'due' | 'settle' | 'retryAt' | 'waitingAlerts' | 'hasten' | 'journal' | 'together'
  >
  readonly routes: readonly Route[]
  /** Milliseconds since 1970 UTC. */
  now(): number
  /** Calls back after so many milliseconds; what it returns takes the order back. */
  after(ms: number, callback: () => void): () => void
  /** In [0, 1). */
  random(): number
  /** The alerts that stand at `now`, in their present version: `AlertBook.standing`. */
  standing(now: number): readonly Alert[]
  report(report: DeliveryReport): void
  readonly log: Log
  readonly backoff?: Backoff
  /** How often the outbox is looked at when nobody pokes; default a second. */
  readonly pollMs?: number
}

/** Takes a delivery out of the outbox undelivered, and says so everywhere. */
export function giveUp(parts: DispatcherParts, delivery: Delivery, now: number, detail: string): void {
  const { route, alert, version, attempts } = delivery
  settle(parts, delivery, now, 'given-up', detail)
  parts.log('error', 'An alert was given up: its route did not take it in time.', {
    route,
    alert,
    version,
    attempts,
    detail,
  })
}

/** Takes a delivery out of the outbox, with a line in the journal. */
export function settle(
  { store, report }: DispatcherParts,
  { key, route, alert, version, attempts }: Delivery,
  now: number,
  outcome: 'delivered' | 'given-up',
  detail: string,
): void {
  store.together(() => {
    store.settle(key, outcome)
    const body = { route, alert, version, outcome, attempts, detail }
    store.journal([{ time: now, kind: 'delivery', ensemble: alert.split('/')[0] ?? null, body }])
  })
  report({ route, what: 'alert', outcome, detail })
}
