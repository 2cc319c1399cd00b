import type { Health } from '../observe/health.ts'
import type { Metrics } from '../observe/metrics.ts'
import type { PageState } from '../page/page-state.ts'
import type { Outcome } from '../pipeline.ts'

/** Keeps health, metrics and page told of how each feed is doing. */
export class FeedDesk {
  readonly #health: Health
  readonly #metrics: Metrics
  readonly #page: PageState
  /** Behind by source, for each feed. */
  readonly #behind = new Map<string, Map<string, number>>()

  constructor(health: Health, metrics: Metrics, page: PageState) {
    this.#health = health
    this.#metrics = metrics
    this.#page = page
  }

  take({ arrival: { feed, event }, dropped }: Outcome): void {
    if (feed === null) return
    const { name } = feed
    switch (event.type) {
      case 'batch': {
        let count = event.batch.count
        for (const drops of Object.values(event.batch.dropped)) count += drops
        this.#metrics.readings(name, count)
        this.#metrics.dropped(name, dropped)
        this.#page.feed(name, { readings: count, dropped })
        if (event.behind === null) this.#health.caughtUp(name)
        else this.#setBehind(name, event.source, event.behind)
        break
      }
      case 'caught-up':
        this.#setBehind(name, event.source, 0)
        break
      case 'ended':
        this.#setBehind(name, event.source, 0)
        this.#health.caughtUp(name)
        break
      case 'assigned':
        for (const source of event.sources)
          this.#sources(name).set(source, this.#sources(name).get(source) ?? 0)
        break
      case 'revoked':
        for (const source of event.sources) this.#sources(name).delete(source)
        break
      case 'connected':
      case 'disconnected': {
        const connected = event.type === 'connected'
        this.#health.connected(name, connected)
        this.#page.feed(name, { connected })
        break
      }
    }
  }

  #setBehind(feed: string, source: string, behind: number): void {
    const sources = this.#sources(feed)
    sources.set(source, behind)
    let sum = 0
    for (const one of sources.values()) sum += one
    this.#health.behind(feed, sum)
    this.#metrics.behind(feed, sum)
    this.#page.feed(feed, { behind: sum })
  }

  #sources(feed: string): Map<string, number> {
    const known = this.#behind.get(feed)
    if (known !== undefined) return known
    const fresh = new Map<string, number>()
    this.#behind.set(feed, fresh)
    return fresh
  }
}
