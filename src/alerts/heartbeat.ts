import type { Pulse } from './alert.ts'
import type { Log, Route } from './route.ts'
import type { DeliveryReport } from './settlement.ts'

export interface HeartbeatParts {
  readonly routes: readonly Route[]
  readonly everyMs: number
  now(): number
  /** Calls back after so many milliseconds; what it returns takes the order back. */
  after(ms: number, callback: () => void): () => void
  /** The last word on the ensembles; null withholds the beat, so that a stalled monitor falls silent. */
  pulse(now: number): Pulse | null
  report(report: DeliveryReport): void
  readonly log: Log
}

/**
 * The sign of life. It goes past the outbox: a beat that could not be told is of no use later. The receiving
 * side pages when beats stay away (config/alertmanager/alertmanager.yml, config/prometheus).
 */
export class Heartbeat {
  readonly #parts: HeartbeatParts
  readonly #stopping = new AbortController()
  readonly #underWay = new Map<string, Promise<void>>()
  readonly #failing = new Set<string>()
  #cancel: (() => void) | null = null

  constructor(parts: HeartbeatParts) {
    this.#parts = parts
  }

  /** Beats at once and then on schedule. */
  start(): void {
    if (this.#cancel !== null || this.#stopping.signal.aborted) return
    this.#cancel = this.#parts.after(this.#parts.everyMs, () => {
      this.#cancel = null
      this.start()
    })
    this.beat()
  }

  beat(): void {
    const now = this.#parts.now()
    const pulse = this.#parts.pulse(now)
    if (pulse === null) return
    for (const route of this.#parts.routes) {
      // A route that has not answered the last beat yet gets no second one on top.
      if (this.#underWay.has(route.name)) continue
      const telling = this.#tell(route, pulse, now).finally(() => this.#underWay.delete(route.name))
      this.#underWay.set(route.name, telling)
    }
  }

  async stop(): Promise<void> {
    this.#cancel?.()
    this.#cancel = null
    this.#stopping.abort()
    await Promise.all(this.#underWay.values())
  }

  async #tell(route: Route, pulse: Pulse, now: number): Promise<void> {
    const { everyMs, report, log } = this.#parts
    const attempt = await route
      .send({ type: 'heartbeat', pulse, everyMs }, now, this.#stopping.signal)
      .catch((error: unknown) => ({ ok: false, detail: String(error) }))
    if (this.#stopping.signal.aborted) return
    const { name } = route
    const { ok, detail } = attempt
    report({ route: name, what: 'heartbeat', outcome: ok ? 'delivered' : 'failed', detail })
    if (ok === !this.#failing.has(name)) return
    if (ok) {
      this.#failing.delete(name)
      log('info', 'The route takes heartbeats again.', { route: name })
    } else {
      this.#failing.add(name)
      log('warn', 'The route takes no heartbeats.', { route: name, detail })
    }
  }
}
