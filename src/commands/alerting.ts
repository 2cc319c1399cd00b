import type { Alert, Pulse } from '../alerts/alert.ts'
import { AlertBook } from '../alerts/alert-book.ts'
import { Dispatcher } from '../alerts/dispatcher.ts'
import { Heartbeat } from '../alerts/heartbeat.ts'
import { postAlerts } from '../alerts/outbox.ts'
import type { Log, Route } from '../alerts/route.ts'
import type { DeliveryReport } from '../alerts/settlement.ts'
import type { Judged } from '../ensemble.ts'
import type { Settings } from '../settings/schema.ts'
import type { JournalEntry, Store } from '../store/store.ts'
import { after } from './drive.ts'

/** Alerts remembered from an earlier run. */
const alertsKept = 1000

export interface AlertingParts {
  readonly settings: Settings
  readonly store: Store
  readonly routes: readonly Route[]
  /** Address of the page, for links in alerts. */
  readonly page: string | null
  readonly log: Log
  now(): number
  /** The last word on the ensembles; null while the pipeline is stuck. */
  pulse(now: number): Pulse | null
  report(report: DeliveryReport): void
  /** New versions of alerts. */
  raised(alerts: readonly Alert[]): void
}

/** From verdicts to people: the book of alerts, the outbox and its dispatcher, the heartbeat. */
export class Alerting {
  readonly #parts: AlertingParts
  readonly #book: AlertBook
  readonly #dispatcher: Dispatcher
  readonly #heartbeat: Heartbeat | null

  constructor(parts: AlertingParts) {
    const { settings, store, routes, now, log } = parts
    this.#parts = parts
    this.#book = new AlertBook({
      runbook: (ensemble) => settings.ensembles[ensemble]?.runbook ?? null,
      page: parts.page,
    })
    this.#book.restore({ alerts: store.alerts(alertsKept).toReversed() as Alert[] })
    const shared = { now, after, log, report: parts.report }
    this.#dispatcher = new Dispatcher({
      ...shared,
      store,
      routes,
      random: Math.random,
      standing: (at) => this.#book.standing(at),
    })
    const { heartbeat } = settings
    this.#heartbeat =
      heartbeat === undefined
        ? null
        : new Heartbeat({
            ...shared,
            routes: routes.filter(({ name }) => heartbeat.routes?.includes(name) ?? true),
            everyMs: heartbeat.every,
            pulse: parts.pulse,
          })
  }

  /** All alerts that are remembered, newest first. */
  get alerts(): readonly Alert[] {
    return this.#book.all()
  }

  start(): void {
    this.#dispatcher.start()
    this.#heartbeat?.start()
  }

  /** Journal and outbox of judged frames, durable when it returns. */
  take(judged: readonly Judged[], titleOf: (ensemble: string) => string): void {
    const { store, routes } = this.#parts
    const now = this.#parts.now()
    const entries = judged.flatMap(journalOf)
    if (entries.length === 0) return
    const alerts: Alert[] = []
    store.together(() => {
      store.journal(entries)
      for (const { ensemble, time, verdict } of judged) {
        if (verdict.ended !== null) {
          alerts.push(...this.#book.take({ type: 'steady', ensemble, shift: verdict.ended, time, now }))
        }
        if (verdict.shift !== null) {
          const { shift } = verdict
          alerts.push(...this.#book.take({ type: 'shift', ensemble, title: titleOf(ensemble), shift, now }))
        }
      }
      postAlerts(store, alerts, routes, now)
    })
    this.#tell(alerts)
  }

  /** Time passes: shelved alerts come back. */
  beat(now: number): void {
    const woken = this.#book.wake(now)
    postAlerts(this.#parts.store, woken, this.#parts.routes, now)
    this.#tell(woken)
  }

  async stop(): Promise<void> {
    await this.#heartbeat?.stop()
    await this.#dispatcher.stop()
    await Promise.all(this.#parts.routes.map((route) => route.close()))
  }

  #tell(alerts: readonly Alert[]): void {
    if (alerts.length === 0) return
    this.#parts.raised(alerts)
    this.#dispatcher.poke()
  }
}

function journalOf({ ensemble, time, verdict }: Judged): JournalEntry[] {
  const entries: JournalEntry[] = verdict.transitions.map((transition) => ({
    time: transition.time,
    kind: 'transition',
    ensemble,
    body: transition,
  }))
  if (verdict.ended !== null) entries.push({ time, kind: 'ended', ensemble, body: { shift: verdict.ended } })
  if (verdict.shift !== null) entries.push({ time, kind: 'shift', ensemble, body: verdict.shift })
  return entries
}
