import type { Shift } from '../regime/regime.ts'
import type { Alert } from './alert.ts'
import type { Message } from './route.ts'
import { rfc3339, rfc3339OrNull } from './times.ts'
import { largest } from './wording.ts'

/** How many carriers an event names; the rest is in the remainder of the store's journal. */
const carriersTold = 20

/** Types of our events, reverse-DNS as CloudEvents asks. */
type EventType =
  | 'io.tautline.shift.confirmed'
  | 'io.tautline.shift.changed'
  | 'io.tautline.shift.ended'
  | 'io.tautline.trial'
  | 'io.tautline.heartbeat'

export interface CloudEvent {
  readonly specversion: '1.0'
  readonly id: string
  readonly source: string
  readonly type: EventType
  readonly subject: string
  readonly time: string
  readonly datacontenttype: 'application/json'
  readonly data: unknown
}

export const cloudEventsContentType = 'application/cloudevents+json; charset=utf-8'

/**
 * A message as a CloudEvents 1.0 event (CloudEvents specification, core attributes), to be written in the
 * structured JSON form. `source` is a URI reference that names this monitor. The id is the alert's id and
 * version, the same for every repetition: receivers drop what they have seen.
 */
export function cloudEvent(message: Message, source: string): CloudEvent {
  if (message.type === 'heartbeat') {
    const time = rfc3339(message.pulse.now)
    return {
      specversion: '1.0',
      id: `heartbeat/${time}`,
      source,
      type: 'io.tautline.heartbeat',
      subject: 'heartbeat',
      time,
      datacontenttype: 'application/json',
      data: { ensembles: message.pulse.ensembles, every_seconds: message.everyMs / 1000 },
    }
  }
  const { alert } = message
  return {
    specversion: '1.0',
    id: `${alert.id}/${alert.version}`,
    source,
    type: typeOf(alert),
    subject: alert.ensemble,
    time: rfc3339(alert.change?.at ?? alert.raised),
    datacontenttype: 'application/json',
    data: alertData(alert),
  }
}

function typeOf(alert: Alert): EventType {
  if (alert.trial) return 'io.tautline.trial'
  if (alert.change?.what === 'ended') return 'io.tautline.shift.ended'
  return alert.version === 1 ? 'io.tautline.shift.confirmed' : 'io.tautline.shift.changed'
}

const alertData = (alert: Alert): unknown => ({
  alert: alert.id,
  version: alert.version,
  ensemble: alert.ensemble,
  title: alert.title,
  state: alert.state,
  trial: alert.trial,
  raised: rfc3339(alert.raised),
  ended: rfc3339OrNull(alert.ended),
  sentence: alert.sentence,
  details: alert.details,
  cautions: alert.cautions,
  runbook: alert.runbook,
  page: alert.page,
  change: alert.change ? { what: alert.change.what, by: alert.change.by, reason: alert.change.reason } : null,
  shelved_until: rfc3339OrNull(alert.withheld?.until ?? null),
  shift: alert.shift === null ? null : shiftData(alert.shift),
})

const shiftData = (shift: Shift): unknown => ({
  number: shift.number,
  kind: shift.kind,
  start: rfc3339(shift.start),
  start_from: rfc3339(shift.startFrom),
  start_to: rfc3339(shift.startTo),
  confirmed: rfc3339(shift.confirmed),
  carriers: largest(shift.carriers, carriersTold),
  remainder: shift.remainder,
  share_before: shift.shareBefore,
  share_after: shift.shareAfter,
  distance: shift.distance,
  evidence: shift.evidence,
  certificate: shift.certificate,
  sight: shift.sight,
  likeness: shift.likeness,
})
