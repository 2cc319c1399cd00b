import { failed, ok, type Result, TautlineError } from '../errors.ts'
import type { Act, Alert, AlertState, Change, Withheld } from './alert.ts'
import { rfc3339 } from './times.ts'
import { sentenceOf } from './wording.ts'

const longestShelvingMs = 366 * 86_400_000

/**
 * The next version of an alert after an act of a person, `now` in milliseconds since 1970 UTC; the same
 * object where the act changes nothing. States and words after ISA-18.2 (from memory). Fails with
 * `act-refused`.
 */
export function afterAct(alert: Alert, act: Act, now: number): Result<Alert> {
  switch (act.type) {
    case 'acknowledge':
      return acknowledge(alert, act.by, now)
    case 'shelve':
      if (!(act.until > now && act.until <= now + longestShelvingMs))
        return refused('Shelving must end after now and within a year.')
      return withhold(alert, 'shelved', 'shelved', act, act.until, now)
    case 'suppress':
      return withhold(alert, 'suppressed-by-design', 'suppressed', act, null, now)
    case 'take-out-of-service':
      return withhold(alert, 'out-of-service', 'taken-out-of-service', act, null, now)
    case 'return-to-service':
      if (!alert.withheld) return ok(alert)
      return ok(returned(alert, { what: 'returned-to-service', at: now, by: act.by, reason: null }))
  }
}

/** The next version once the regime is steady again since `ended`; the same object where it had ended before. */
export function afterEnd(alert: Alert, ended: number, now: number): Alert {
  if (alert.ended !== null) return alert
  const sentence = alert.shift === null ? alert.sentence : sentenceOf(alert.title, alert.shift, ended)
  return next({ ...alert, ended, sentence, withheld: null }, 'returned-to-normal', {
    what: 'ended',
    at: now,
    by: null,
    reason: null,
  })
}

/** Gives back an alert whose shelving has run out; the same object for all others. */
export function afterTime(alert: Alert, now: number): Alert {
  const until = alert.withheld?.until ?? null
  if (until === null || now < until) return alert
  return returned(alert, {
    what: 'returned-to-service',
    at: now,
    by: null,
    reason: `Shelving ran out at ${rfc3339(until)}.`,
  })
}

function acknowledge(alert: Alert, by: string, now: number): Result<Alert> {
  if (alert.acknowledged) return ok(alert)
  if (alert.withheld) return refused(`It is ${alert.state}; return it to service first.`)
  const change: Change = { what: 'acknowledged', at: now, by, reason: null }
  const state = alert.ended === null ? 'acknowledged' : alert.state
  return ok(next({ ...alert, acknowledged: { by, at: now } }, state, change))
}

function withhold(
  alert: Alert,
  state: AlertState,
  what: Change['what'],
  { by, reason }: { readonly by: string; readonly reason: string },
  until: number | null,
  now: number,
): Result<Alert> {
  if (alert.ended !== null) return refused('It has ended.')
  if (reason.trim() === '') return refused('A reason is needed.')
  if (alert.state === state && alert.withheld?.until === until) return ok(alert)
  const before = alert.acknowledged ? 'acknowledged' : 'unacknowledged'
  const withheld: Withheld = { before, by, reason, until }
  return ok(next({ ...alert, withheld }, state, { what, at: now, by, reason }))
}

const returned = (alert: Alert, change: Change): Alert =>
  next({ ...alert, withheld: null }, alert.withheld?.before ?? alert.state, change)

const next = (alert: Alert, state: AlertState, change: Change): Alert => ({
  ...alert,
  state,
  change,
  version: alert.version + 1,
})

const refused = (detail: string): Result<never> => failed(new TautlineError('act-refused', detail))
