import type { Delivery, Store } from '../store/store.ts'
import type { Alert } from './alert.ts'
import type { Message, Route } from './route.ts'

/** One delivery for each new version and route, due at once; `now` in milliseconds since 1970 UTC. */
function deliveriesOf(
  alerts: readonly Alert[],
  routes: readonly Pick<Route, 'name' | 'giveUpAfterMs'>[],
  now: number,
): readonly Delivery[] {
  return alerts.flatMap((alert) =>
    routes.map(({ name, giveUpAfterMs }) => ({
      key: `${name}/${alert.id}/${alert.version}`,
      route: name,
      alert: alert.id,
      version: alert.version,
      payload: { type: 'alert', alert } satisfies Message,
      created: now,
      attempts: 0,
      notBefore: now,
      giveUpAt: now + giveUpAfterMs,
      lastError: null,
    })),
  )
}

/** Saves new versions of alerts and puts them in the outbox, all of it in one transaction. */
export function postAlerts(
  store: Pick<Store, 'together' | 'saveAlert' | 'enqueue'>,
  alerts: readonly Alert[],
  routes: readonly Pick<Route, 'name' | 'giveUpAfterMs'>[],
  now: number,
): void {
  if (alerts.length === 0) return
  store.together(() => {
    for (const alert of alerts) store.saveAlert(alert.id, alert)
    store.enqueue(deliveriesOf(alerts, routes, now))
  })
}
