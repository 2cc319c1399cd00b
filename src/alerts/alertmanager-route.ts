import { failed, ok, type Result, TautlineError } from '../errors.ts'
import type { RouteSettings } from '../settings/schema.ts'
import type { Alert } from './alert.ts'
import { endToldForMs, trialAlert } from './alert-book.ts'
import { identityLabels, type PostableAlert, postableAlert, postableHeartbeat } from './alertmanager-body.ts'
import { post, tryHost } from './http-post.ts'
import { type Attempt, type Message, type Route, sent, unsent } from './route.ts'

export type AlertmanagerSettings = Extract<RouteSettings, { alertmanager: unknown }>

/**
 * Alertmanager, interface version 2, every instance of a cluster. An alert counts as delivered when one
 * instance has taken it: the others hear of it with the next repetition. Fails with
 * `route-label`.
 */
export function alertmanagerRoute(name: string, settings: AlertmanagerSettings): Result<Route> {
  const { urls, username, password, 'resend-every': resendEveryMs } = settings.alertmanager
  const { labels, timeout: timeoutMs, 'give-up-after': giveUpAfterMs } = settings
  const reserved = identityLabels.find((label) => Object.hasOwn(labels, label))
  if (reserved !== undefined)
    return failed(new TautlineError('route-label', `Route ${name} sets ${reserved}.`))
  const targets = urls.map(alertsUrl)
  const headers: Record<string, string> = { 'content-type': 'application/json' }
  if (username !== undefined)
    headers.authorization = `Basic ${Buffer.from(`${username}:${password ?? ''}`).toString('base64')}`

  /** Ended alerts and the moment until which their end is repeated. */
  const ends = new Map<string, { readonly alert: Alert; readonly until: number }>()
  let aliveSince: number | null = null

  const tell = async (
    alerts: readonly PostableAlert[],
    now: number,
    signal: AbortSignal,
  ): Promise<Attempt> => {
    const body = JSON.stringify(alerts)
    const attempts = await Promise.all(
      targets.map((url) => post({ url, headers, body, timeoutMs }, now, signal)),
    )
    return together(attempts)
  }

  const send = async (message: Message, now: number, signal: AbortSignal): Promise<Attempt> => {
    if (message.type === 'heartbeat') {
      aliveSince ??= message.pulse.now
      const beat = postableHeartbeat(message.pulse, labels, aliveSince, message.everyMs)
      return tell([beat], now, signal)
    }
    const { alert } = message
    const attempt = await tell([postableAlert(alert, labels, now, resendEveryMs)], now, signal)
    if (attempt.ok && !alert.trial) {
      if (alert.ended === null) ends.delete(alert.id)
      else if (!ends.has(alert.id)) ends.set(alert.id, { alert, until: now + endToldForMs })
    }
    return attempt
  }

  return ok({
    name,
    kind: 'alertmanager',
    giveUpAfterMs,
    resendEveryMs,
    send,
    async resend(alerts, now, signal) {
      for (const [id, { until }] of ends) if (now >= until) ends.delete(id)
      const all = new Map([...ends.values()].map(({ alert }) => [alert.id, alert]))
      for (const alert of alerts) all.set(alert.id, alert)
      if (all.size === 0) return null
      return tell(
        [...all.values()].map((alert) => postableAlert(alert, labels, now, resendEveryMs)),
        now,
        signal,
      )
    },
    async check(signal) {
      return together(await Promise.all(targets.map((url) => tryHost(url, timeoutMs, signal))))
    },
    trial: (now, signal) => send({ type: 'alert', alert: trialAlert(now) }, now, signal),
    async close() {},
  })
}

/** What several instances said: success where one succeeded, with the complaints of the others. */
function together(attempts: readonly Attempt[]): Attempt {
  const details = attempts.map(({ detail }) => detail).join('; ')
  const failures = attempts.filter((attempt) => !attempt.ok)
  if (failures.length < attempts.length) return sent(details)
  const waits = failures.map(({ retryAfterMs }) => retryAfterMs).filter((wait) => wait !== null)
  return unsent(details, {
    routeWide: failures.some(({ routeWide }) => routeWide),
    retryAfterMs: waits.length === 0 ? null : Math.min(...waits),
  })
}

function alertsUrl(base: string): URL {
  const url = new URL(base)
  url.pathname = `${url.pathname.replace(/\/+$/, '')}/api/v2/alerts`
  url.search = ''
  url.hash = ''
  return url
}
