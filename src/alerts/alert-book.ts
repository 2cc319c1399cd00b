import { failed, ok, type Result, TautlineError } from '../errors.ts'
import type { Act, Alert, AlertEvent } from './alert.ts'
import { afterAct, afterEnd, afterTime } from './life-cycle.ts'
import { rfc3339 } from './times.ts'
import { cautions, detailsOf, sentenceOf } from './wording.ts'

/** For how long after its end an alert is still told to routes that keep state of their own. */
export const endToldForMs = 5 * 60_000

export interface BookOptions {
  /** Address of the runbook of an ensemble, or null. */
  readonly runbook: (ensemble: string) => string | null
  /** Address under which people reach the page, or null. */
  readonly page: string | null
  /** How many ended alerts are remembered; default 200. */
  readonly endedKept?: number
}

export interface BookSnapshot {
  readonly alerts: readonly Alert[]
}

/**
 * All alerts that matter now: one for each ensemble and shift. `take` gives the new versions that an event
 * makes, and gives none for an event that it has seen before, so that events may be replayed after a crash.
 */
export class AlertBook {
  readonly #options: BookOptions
  /** In the order in which they were raised. */
  readonly #alerts = new Map<string, Alert>()

  constructor(options: BookOptions) {
    this.#options = options
  }

  /**
   * A `shift` raises an alert and ends those of earlier shifts of the ensemble, whose regime is over; `steady`
   * ends the alerts of the ensemble up to that shift that were confirmed before it; a `trial` raises one that has ended already.
   */
  take(event: AlertEvent): readonly Alert[] {
    switch (event.type) {
      case 'shift': {
        const raised = shiftAlert(event, this.#options)
        if (this.#alerts.has(raised.id)) return []
        const { confirmed } = event.shift
        const over = this.#open(event.ensemble).map((alert) => afterEnd(alert, confirmed, event.now))
        return this.#keep([...over, raised])
      }
      case 'steady': {
        const over = this.#open(event.ensemble).filter(
          ({ shift }) => shift !== null && shift.number <= event.shift && shift.confirmed <= event.time,
        )
        return this.#keep(over.map((alert) => afterEnd(alert, event.time, event.now)))
      }
      case 'trial': {
        const trial = trialAlert(event.now)
        return this.#alerts.has(trial.id) ? [] : this.#keep([trial])
      }
    }
  }

  /** Fails with `alert-unknown` or `act-refused`; gives null where the act changes nothing. */
  act(id: string, act: Act, now: number): Result<Alert | null> {
    const alert = this.#alerts.get(id)
    if (alert === undefined) return failed(new TautlineError('alert-unknown', `${id}.`))
    const result = afterAct(alert, act, now)
    if (!result.ok) return result
    return ok(this.#keep(result.value === alert ? [] : [result.value])[0] ?? null)
  }

  /** New versions of the alerts whose shelving has run out. To be called on the beat of the clock. */
  wake(now: number): readonly Alert[] {
    const woken: Alert[] = []
    for (const alert of this.#alerts.values()) {
      const after = afterTime(alert, now)
      if (after !== alert) woken.push(after)
    }
    return this.#keep(woken)
  }

  /** Those that have not ended, and those that ended within the last five minutes by the wall clock. */
  standing(now: number): readonly Alert[] {
    return [...this.#alerts.values()].filter(
      (alert) => !alert.trial && (alert.ended === null || now - (alert.change?.at ?? 0) < endToldForMs),
    )
  }

  /** Newest first. */
  all(): readonly Alert[] {
    return [...this.#alerts.values()].reverse()
  }

  snapshot(): BookSnapshot {
    return { alerts: [...this.#alerts.values()] }
  }

  /** Takes back a snapshot, or the alerts of the store, oldest first. */
  restore(snapshot: unknown): void {
    this.#alerts.clear()
    this.#keep((snapshot as BookSnapshot).alerts)
  }

  #open(ensemble: string): readonly Alert[] {
    return [...this.#alerts.values()].filter((alert) => alert.ensemble === ensemble && alert.ended === null)
  }

  #keep(versions: readonly Alert[]): readonly Alert[] {
    for (const alert of versions) this.#alerts.set(alert.id, alert)
    const ended = [...this.#alerts.values()].filter((alert) => alert.ended !== null)
    for (const { id } of ended.slice(0, -(this.#options.endedKept ?? 200))) this.#alerts.delete(id)
    return versions
  }
}

/** The first version of the alert of a shift. */
function shiftAlert(
  { ensemble, title, shift, now }: Extract<AlertEvent, { type: 'shift' }>,
  { runbook, page }: BookOptions,
): Alert {
  return {
    id: `${ensemble}/${shift.number}/${rfc3339(shift.start)}`,
    version: 1,
    ensemble,
    title,
    state: 'unacknowledged',
    ended: null,
    trial: false,
    sentence: sentenceOf(title, shift, null),
    details: detailsOf(shift),
    cautions,
    runbook: runbook(ensemble),
    page: page === null ? null : pageLink(page, ensemble),
    shift,
    raised: now,
    change: { what: 'confirmed', at: now, by: null, reason: null },
    acknowledged: null,
    withheld: null,
  }
}

/** A marked trial: it asks nobody to act and is over as soon as it is raised. */
export function trialAlert(now: number): Alert {
  return {
    id: `trial/0/${rfc3339(now)}`,
    version: 1,
    ensemble: 'trial',
    title: 'Trial',
    state: 'returned-to-normal',
    ended: now,
    trial: true,
    sentence: `Trial: this message of ${rfc3339(now)} only tries the route; nothing has changed and nobody needs to act.`,
    details: [],
    cautions: [],
    runbook: null,
    page: null,
    shift: null,
    raised: now,
    change: { what: 'trial', at: now, by: null, reason: null },
    acknowledged: null,
    withheld: null,
  }
}

function pageLink(page: string, ensemble: string): string {
  const link = new URL(page)
  link.searchParams.set('ensemble', ensemble)
  return link.href
}
