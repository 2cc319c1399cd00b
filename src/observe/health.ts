/** What the state of one feed contributes to readiness. */
interface FeedHealth {
  connected: boolean
  behind: number
  caughtUp: boolean
}

export interface HealthReport {
  readonly ok: boolean
  readonly reasons: readonly string[]
}

export interface HealthOptions {
  /** Messages or bytes that a feed may be behind and still count as abreast. */
  readonly mostBehind: number
  /** Milliseconds that the pipeline may take over what it has in hand before the process counts as stuck. */
  readonly stallAfterMs: number
}

export const defaultHealth: HealthOptions = { mostBehind: 10_000, stallAfterMs: 60_000 }

/**
 * Is the monitor alive, and is what it shows the present? Alive as long as it gets on with what it has in
 * hand; ready when every feed is connected and abreast of its sources and the store takes what is written.
 * Time is an argument, milliseconds since 1970 UTC.
 */
export class Health {
  readonly #options: HealthOptions
  readonly #feeds = new Map<string, FeedHealth>()
  #busySince: number | null = null
  #storeFault: string | null = null
  #stopping = false

  constructor(feeds: readonly string[], options: HealthOptions = defaultHealth) {
    this.#options = options
    for (const feed of feeds) this.#feeds.set(feed, { connected: false, behind: 0, caughtUp: false })
  }

  connected(feed: string, connected: boolean): void {
    const state = this.#feed(feed)
    state.connected = connected
    if (!connected) state.caughtUp = false
  }

  /** How far a feed is behind its sources, all of them together. */
  behind(feed: string, behind: number): void {
    const state = this.#feed(feed)
    state.behind = behind
    if (behind <= this.#options.mostBehind) state.caughtUp = true
  }

  caughtUp(feed: string): void {
    this.#feed(feed).caughtUp = true
  }

  /** Work was taken in hand at `now`, or finished (null). */
  busy(since: number | null): void {
    this.#busySince = since
  }

  store(fault: string | null): void {
    this.#storeFault = fault
  }

  stopping(): void {
    this.#stopping = true
  }

  live(now: number): HealthReport {
    const { stallAfterMs } = this.#options
    const stalled = this.#busySince !== null && now - this.#busySince > stallAfterMs
    return report(stalled ? [`no progress for more than ${stallAfterMs / 1000} s`] : [])
  }

  ready(now: number): HealthReport {
    const reasons = [...this.live(now).reasons]
    if (this.#stopping) reasons.push('stopping')
    if (this.#storeFault !== null) reasons.push(`the store cannot be written: ${this.#storeFault}`)
    for (const [feed, { connected, behind, caughtUp }] of this.#feeds) {
      if (!connected) reasons.push(`feed ${feed} is not connected`)
      else if (behind > this.#options.mostBehind) reasons.push(`feed ${feed} is ${behind} behind`)
      else if (!caughtUp) reasons.push(`feed ${feed} has not been read up to the present yet`)
    }
    return report(reasons)
  }

  #feed(name: string): FeedHealth {
    const known = this.#feeds.get(name)
    if (known !== undefined) return known
    const fresh: FeedHealth = { connected: false, behind: 0, caughtUp: false }
    this.#feeds.set(name, fresh)
    return fresh
  }
}

const report = (reasons: readonly string[]): HealthReport => ({ ok: reasons.length === 0, reasons })
