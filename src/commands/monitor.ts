import { lastValueFrom, type Observable } from 'rxjs'
import type { Route } from '../alerts/route.ts'
import type { Ensemble } from '../ensemble.ts'
import type { Feed } from '../feeds/feed.ts'
import { Health } from '../observe/health.ts'
import type { Log } from '../observe/log.ts'
import { Metrics } from '../observe/metrics.ts'
import { summaryRecord } from '../observe/records.ts'
import { PageState } from '../page/page-state.ts'
import { type PageServer, pageServer } from '../page/server.ts'
import { type Outcome, pipeline } from '../pipeline.ts'
import type { Carrier, Transition } from '../regime/regime.ts'
import type { Settings } from '../settings/schema.ts'
import type { Store } from '../store/store.ts'
import { Alerting } from './alerting.ts'
import type { Checkpoints } from './checkpoints.ts'
import { longestSlice, systemDrive } from './drive.ts'
import { FeedDesk } from './feed-desk.ts'
import type { RecordWriter } from './record-writer.ts'
import { Totals } from './totals.ts'

const beatMs = 250
const retryStoreMs = 1000
/** Entries of the journal that the page gives of an ensemble. */
const journalShown = 200

export interface MonitorParts {
  readonly settings: Settings
  readonly version: string
  readonly feeds: readonly Feed[]
  readonly ensembles: readonly Ensemble[]
  readonly routes: readonly Route[]
  readonly store: Store
  /** null: nothing is to survive the run (the demo). */
  readonly checkpoints: Checkpoints | null
  readonly writer: RecordWriter | null
  readonly demo: { readonly speed: number; readonly note: string } | null
  readonly log: Log
  readonly stop: Observable<unknown>
  now(): number
  /** The page is up. */
  listening?(url: string): void
}

/** The monitor at work: the pipeline with all that looks on, until the feeds end or it is told to stop. */
export class Monitor {
  readonly #parts: MonitorParts
  readonly #metrics: Metrics
  readonly #health: Health
  readonly #state: PageState
  readonly #desk: FeedDesk
  readonly #alerting: Alerting
  readonly #totals = new Totals()
  readonly #titles: ReadonlyMap<string, string>
  /** The signals that lead each ensemble's leading mode now. */
  readonly #leaders = new Map<string, readonly Carrier[]>()

  constructor(parts: MonitorParts) {
    const { settings, feeds, ensembles, routes, version } = parts
    this.#parts = parts
    this.#titles = new Map(ensembles.map(({ name, title }) => [name, title]))
    this.#metrics = new Metrics(version)
    for (const { name } of feeds) this.#metrics.openFeed(name)
    for (const { name } of ensembles) this.#metrics.openEnsemble(name)
    for (const { name } of routes) this.#metrics.openRoute(name)
    this.#health = new Health(feeds.map(({ name }) => name))
    this.#state = new PageState({
      version,
      demo: parts.demo,
      ensembles: ensembles.map(({ name, title }) => ({ name, title })),
      feeds: feeds.map(({ name }) => name),
    })
    this.#desk = new FeedDesk(this.#health, this.#metrics, this.#state)
    this.#alerting = new Alerting({
      settings,
      store: parts.store,
      routes,
      page: settings.page.url ?? `http://${settings.page.listen}/`,
      log: parts.log,
      now: parts.now,
      pulse: (now) => (this.#health.live(now).ok ? { ensembles: this.#state.states(), now } : null),
      report: ({ route, outcome }) => this.#metrics.delivery(route, outcome),
      raised: (alerts) => {
        for (const alert of alerts) this.#state.alert(alert)
      },
    })
    for (const alert of [...this.#alerting.alerts].reverse()) this.#state.alert(alert)
    for (const { name } of ensembles) {
      const [last] = parts.store.readJournal({ ensemble: name, kind: 'transition', limit: 1 })
      if (last !== undefined) this.#state.transition(name, last.body as Transition)
    }
  }

  async run(): Promise<void> {
    const { feeds, ensembles, stop, now, writer } = this.#parts
    const page = await this.#open()
    this.#alerting.start()
    const drive = systemDrive(now, beatMs)
    const started = drive.lap()
    const run = pipeline({
      feeds,
      ensembles,
      drive,
      sliceMs: longestSlice,
      stop,
      effects: (outcome) => this.#effects(outcome),
    })
    try {
      await lastValueFrom(run, { defaultValue: null })
      this.#health.stopping()
      await this.#save()
    } finally {
      await this.#alerting.stop()
      await page.close()
    }
    const { readings, dropped, frames, shifts, findings } = this.#totals
    const seconds = (drive.lap() - started) / 1000
    await writer?.record(summaryRecord({ readings, dropped, frames, shifts, findings, seconds }))
  }

  async #open(): Promise<PageServer> {
    const { settings, store, now, listening, log } = this.#parts
    const { listen, token, url } = settings.page
    const page = await pageServer({
      listen,
      ...(token === undefined ? {} : { token }),
      ...(url === undefined ? {} : { url }),
      state: this.#state,
      metrics: () => this.#metrics.text(),
      live: () => spoken(this.#health.live(now())),
      ready: () => spoken(this.#health.ready(now())),
      quarantine: () => store.readQuarantine(200),
      alert: (id) => store.alert(id),
      regimes: (ensemble) => store.readJournal({ ensemble, limit: journalShown }),
      now,
    })
    log('info', 'The page is up.', { url: page.url })
    listening?.(page.url)
    return page
  }

  async #effects(outcome: Outcome): Promise<void> {
    const { writer, checkpoints, now, store } = this.#parts
    const { arrival, judged, findings, quarantined } = outcome
    this.#health.busy(now())
    await this.#durably(() => {
      this.#alerting.take(judged, (ensemble) => this.#titles.get(ensemble) ?? ensemble)
      if (quarantined.length > 0) store.quarantine(quarantined)
    })
    this.#totals.take(outcome)
    this.#desk.take(outcome)
    const at = now()
    for (const one of judged) {
      this.#metrics.judged(one, at)
      this.#leaders.set(one.ensemble, one.verdict.leaders)
      this.#state.judged(one)
    }
    for (const { ensemble, finding } of findings) this.#state.finding(ensemble, finding)
    await writer?.outcome(outcome)
    if (arrival.feed !== null) checkpoints?.advance(arrival.feed.name, arrival.event)
    else await this.#beat(at)
    this.#health.busy(null)
  }

  async #beat(now: number): Promise<void> {
    const { checkpoints, settings, store, ensembles } = this.#parts
    this.#alerting.beat(now)
    this.#metrics.waiting(store.waiting())
    for (const ensemble of ensembles) this.#metrics.conditions(ensemble.name, ensemble.conditions)
    for (const [ensemble, leaders] of this.#leaders) this.#metrics.carriers(ensemble, leaders)
    if (checkpoints === null) return
    if (now - checkpoints.savedAt >= settings.store.every) await this.#save()
    this.#metrics.checkpointAge(Math.max(0, now - checkpoints.savedAt) / 1000)
  }

  async #save(): Promise<void> {
    const { checkpoints, ensembles, feeds, now } = this.#parts
    await this.#durably(() => checkpoints?.save(ensembles, feeds, now()))
  }

  /** Tries a write until the store takes it: meanwhile nothing is acknowledged and nothing is lost. */
  async #durably(write: () => void | Promise<void> | undefined): Promise<void> {
    for (;;) {
      try {
        await write()
        this.#health.store(null)
        return
      } catch (error) {
        const fault = error instanceof Error ? error.message : String(error)
        this.#health.store(fault)
        this.#parts.log('error', 'The store cannot be written; trying again.', { fault })
        await new Promise((resolve) => setTimeout(resolve, retryStoreMs))
      }
    }
  }
}

const spoken = ({ ok, reasons }: { ok: boolean; reasons: readonly string[] }) => ({
  ok,
  body: { ok, reasons },
})
