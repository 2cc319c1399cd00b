import type { Alert, Pulse } from './alert.ts'
import { rfc3339 } from './times.ts'
import { carriersText, quietCaution } from './wording.ts'

/** One alert of `POST /api/v2/alerts` (OpenAPI of Alertmanager's version 2 interface). */
export interface PostableAlert {
  readonly labels: Readonly<Record<string, string>>
  readonly annotations: Readonly<Record<string, string>>
  readonly startsAt: string
  readonly endsAt: string
  readonly generatorURL?: string
}

/** Labels that tell our alerts apart: a route's own labels may not replace them. */
export const identityLabels = ['alertname', 'ensemble', 'kind', 'shift'] as const

/** How many intervals without a repetition Alertmanager waits before it takes an alert as ended. */
const intervalsToEnd = 4
/** How long a trial stands in Alertmanager. */
const trialStandsMs = 5 * 60_000

/**
 * An alert as Alertmanager wants it at `now` (milliseconds since 1970 UTC). The label set is the same for
 * all versions. Alertmanager knows no word for an alert that is withheld: it is told as ended, with the
 * state in an annotation, and raised again when it returns to service.
 */
export function postableAlert(
  alert: Alert,
  labels: Readonly<Record<string, string>>,
  now: number,
  resendEveryMs: number,
): PostableAlert {
  const { shift } = alert
  const stands = alert.ended === null && !alert.withheld
  const endsAt = alert.trial
    ? alert.raised + trialStandsMs
    : stands
      ? now + intervalsToEnd * resendEveryMs
      : now
  return {
    labels: alert.trial
      ? { severity: 'info', ...labels, alertname: 'TautlineTrial' }
      : {
          severity: 'warning',
          ...labels,
          alertname: 'TautlineShift',
          ensemble: alert.ensemble,
          ...(shift === null ? {} : { kind: shift.kind, shift: String(shift.number) }),
        },
    annotations: filled({
      summary: alert.sentence,
      description: alert.details.join('\n'),
      caution: alert.cautions.join(' '),
      runbook_url: alert.runbook,
      carriers: shift === null ? null : carriersText(shift),
      state: alert.state,
    }),
    // A start ahead of the wall clock (recorded readings, a sender's wrong clock) would be refused.
    startsAt: rfc3339(Math.min(shift?.start ?? alert.raised, now)),
    endsAt: rfc3339(endsAt),
    ...(alert.page === null ? {} : { generatorURL: alert.page }),
  }
}

/** The sign of life, standing since `since`; it ends by itself when it is not repeated. */
export function postableHeartbeat(
  pulse: Pulse,
  labels: Readonly<Record<string, string>>,
  since: number,
  everyMs: number,
): PostableAlert {
  const states = Object.entries(pulse.ensembles).map(([name, state]) => `${name} ${state}`)
  return {
    labels: { severity: 'none', ...labels, alertname: 'TautlineHeartbeat' },
    annotations: filled({
      summary: 'The monitor is alive. This alert is always there; its absence is what should page.',
      description: states.length === 0 ? 'No ensembles.' : `Ensembles: ${states.join(', ')}.`,
      caution: quietCaution,
    }),
    startsAt: rfc3339(Math.min(since, pulse.now)),
    endsAt: rfc3339(pulse.now + intervalsToEnd * everyMs),
  }
}

const filled = (annotations: Readonly<Record<string, string | null>>): Record<string, string> =>
  Object.fromEntries(
    Object.entries(annotations).filter(
      (entry): entry is [string, string] => entry[1] !== null && entry[1] !== '',
    ),
  )
