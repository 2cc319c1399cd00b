import type { Alert } from '../alerts/alert.ts'
import type { Judged } from '../ensemble.ts'
import type { Finding } from '../frames/frame.ts'
import { addDrops, type DropCounts } from '../reasons.ts'
import type { State, Transition } from '../regime/regime.ts'
import { pageCautions } from './cautions.ts'
import { EnsemblePage } from './ensemble-page.ts'
import { type HistorySize, usualHistory } from './history.ts'
import type { AlertView, EnsembleChange, FeedView, FindingView, PageChange, PageView } from './view.ts'

const mostAlerts = 40
const mostFindings = 60
/** Milliseconds between two changes of one ensemble, and of the feeds, as the page is told them. */
const ensembleEveryMs = 250
const feedsEveryMs = 1000

export interface PageStateOptions {
  readonly version: string
  readonly demo: PageView['demo']
  readonly ensembles: readonly { readonly name: string; readonly title: string }[]
  readonly feeds: readonly string[]
  readonly history?: HistorySize
}

/** What has become of a feed since it was last told: counts add up, the rest replaces. */
export interface FeedNews {
  readonly connected?: boolean
  readonly behind?: number
  readonly readings?: number
  readonly dropped?: DropCounts
}

/**
 * The present state as the page shows it, bounded whatever comes. The composer tells it what happens;
 * `view` gives all of it, `changes` what is new. Time is an argument, milliseconds since 1970 UTC.
 */
export class PageState {
  readonly #options: PageStateOptions
  readonly #ensembles = new Map<string, EnsemblePage>()
  readonly #toldAt = new Map<string, number>()
  readonly #feeds = new Map<string, FeedView>()
  #feedsToldAt = Number.NEGATIVE_INFINITY
  readonly #alerts = new Map<string, AlertView>()
  readonly #findings = new Map<string, FindingView>()
  #news = { alerts: false, findings: false, feeds: false }

  constructor(options: PageStateOptions) {
    this.#options = options
    const size = options.history ?? usualHistory
    for (const { name, title } of options.ensembles)
      this.#ensembles.set(name, new EnsemblePage(name, title, size))
    for (const name of options.feeds) this.#feeds.set(name, freshFeed(name))
  }

  /** A frame of one of the ensembles; frames of others are not shown. */
  judged(judged: Judged): void {
    this.#ensembles.get(judged.ensemble)?.judged(judged)
  }

  /** The last transition of an earlier run, so that the page knows since when the state holds. */
  transition(ensemble: string, transition: Transition): void {
    this.#ensembles.get(ensemble)?.transition(transition)
  }

  /** A new version of an alert, or an alert of an earlier run. */
  alert(alert: Alert): void {
    const known = this.#alerts.get(alert.id)
    if (known !== undefined && known.version > alert.version) return
    this.#alerts.set(alert.id, alertView(alert))
    if (alert.shift !== null && alert.ended === null)
      this.#ensembles.get(alert.ensemble)?.standing(alert.shift)
    for (const { id } of this.#sortedAlerts().slice(mostAlerts)) this.#alerts.delete(id)
    this.#news.alerts = true
  }

  finding(ensemble: string, { signal, finding, from, to, detail }: Finding): void {
    const key = JSON.stringify([ensemble, signal, finding, from])
    this.#findings.set(key, { ensemble, signal, finding, from, to, detail })
    if (this.#findings.size > mostFindings) {
      const over = [...this.#findings].find(([, { to }]) => to !== null) ?? [...this.#findings][0]!
      this.#findings.delete(over[0])
    }
    this.#news.findings = true
  }

  feed(name: string, { connected, behind, readings = 0, dropped = {} }: FeedNews): void {
    const feed = this.#feeds.get(name)
    if (feed === undefined) return
    this.#feeds.set(name, {
      name,
      connected: connected ?? feed.connected,
      behind: behind ?? feed.behind,
      readings: feed.readings + readings,
      dropped: addDrops(feed.dropped, dropped),
    })
    this.#news.feeds = true
  }

  /** The state of each ensemble, by name. */
  states(): Readonly<Record<string, State>> {
    return Object.fromEntries([...this.#ensembles.values()].map(({ name, state }) => [name, state]))
  }

  view(now: number): PageView {
    const { version, demo } = this.#options
    return {
      now,
      version,
      demo,
      ensembles: [...this.#ensembles.values()].map((ensemble) => ensemble.view(now)),
      mostPoints: (this.#options.history ?? usualHistory).points,
      alerts: this.#sortedAlerts(),
      findings: this.#sortedFindings(),
      feeds: [...this.#feeds.values()],
      cautions: pageCautions,
    }
  }

  /** What is new since the last call, or null. An ensemble comes at most four times a second, the feeds once. */
  changes(now: number): PageChange | null {
    const ensembles: EnsembleChange[] = []
    for (const ensemble of this.#ensembles.values()) {
      const toldAt = this.#toldAt.get(ensemble.name) ?? Number.NEGATIVE_INFINITY
      if (!ensemble.dirty || isSoon(now, toldAt, ensembleEveryMs)) continue
      this.#toldAt.set(ensemble.name, now)
      ensembles.push(ensemble.change(now))
    }
    const { alerts, findings } = this.#news
    const feeds = this.#news.feeds && !isSoon(now, this.#feedsToldAt, feedsEveryMs)
    if (feeds) this.#feedsToldAt = now
    this.#news = { alerts: false, findings: false, feeds: this.#news.feeds && !feeds }
    if (ensembles.length === 0 && !alerts && !findings && !feeds) return null
    return {
      now,
      ensembles,
      ...(alerts ? { alerts: this.#sortedAlerts() } : {}),
      ...(findings ? { findings: this.#sortedFindings() } : {}),
      ...(feeds ? { feeds: [...this.#feeds.values()] } : {}),
    }
  }

  #sortedAlerts(): AlertView[] {
    return [...this.#alerts.values()].sort(
      (a, b) => Number(a.ended !== null) - Number(b.ended !== null) || b.raised - a.raised,
    )
  }

  #sortedFindings(): FindingView[] {
    return [...this.#findings.values()].sort(
      (a, b) => Number(a.to !== null) - Number(b.to !== null) || b.from - a.from,
    )
  }
}

/** False too when the clock was set back, so that nothing waits for it to catch up. */
const isSoon = (now: number, before: number, ms: number): boolean => now >= before && now - before < ms

const freshFeed = (name: string): FeedView => ({
  name,
  connected: null,
  behind: null,
  readings: 0,
  dropped: {},
})

const alertView = (alert: Alert): AlertView => ({
  id: alert.id,
  version: alert.version,
  ensemble: alert.ensemble,
  title: alert.title,
  state: alert.state,
  trial: alert.trial,
  sentence: alert.sentence,
  details: alert.details,
  cautions: alert.cautions,
  runbook: alert.runbook,
  raised: alert.raised,
  ended: alert.ended,
  acknowledgedBy: alert.acknowledged?.by ?? null,
  withheld:
    alert.withheld == null
      ? null
      : { by: alert.withheld.by, reason: alert.withheld.reason, until: alert.withheld.until },
})
