import type { Delivery } from '../store/store.ts'
import { backoffMs, defaultBackoff } from './backoff.ts'
import { type Attempt, type Message, type Route, unsent } from './route.ts'
import { type DispatcherParts, giveUp, settle } from './settlement.ts'

/** A failure older than this says nothing of the route's present state. */
const freshFailureMs = 3 * 60_000

/**
 * The way to one route: carries one message at a time. After a failure that any message would have met, the
 * whole lane waits; after one that speaks of a single message, only that message waits.
 */
export class Lane {
  readonly #route: Route
  readonly #parts: DispatcherParts
  readonly #signal: AbortSignal
  #busy: Promise<boolean> | null = null
  #closed = false
  /** Failures in a row that speak of the route. */
  #failures = 0
  #lastFailure = Number.NEGATIVE_INFINITY
  #shutUntil = Number.NEGATIVE_INFINITY
  #repeatAt = Number.NEGATIVE_INFINITY

  constructor(route: Route, parts: DispatcherParts, signal: AbortSignal) {
    this.#route = route
    this.#parts = parts
    this.#signal = signal
  }

  /**
   * Carries these deliveries, one for each alert at most, and repeats what stands when it is time. Null where
   * there is nothing to do or the lane is busy; else resolves with whether anything has left the outbox.
   */
  take(deliveries: readonly Delivery[], now: number): Promise<boolean> | null {
    if (this.#busy !== null || this.#closed) return null
    const repeat = this.#route.resendEveryMs !== null && now >= this.#repeatAt
    if (deliveries.length === 0 && !repeat) return null
    if (now < this.#shutUntil && !deliveries.some((delivery) => this.#isOver(delivery, now))) return null
    this.#busy = this.#carryAll(deliveries).finally(() => {
      this.#busy = null
    })
    return this.#busy
  }

  /** Carries nothing further than what is in hand. */
  close(): void {
    this.#closed = true
  }

  async idle(): Promise<void> {
    await this.#busy?.catch(() => {})
  }

  /** After the clock was set back, waits that it measured mean nothing. */
  forgetWaits(): void {
    this.#shutUntil = Number.NEGATIVE_INFINITY
    this.#repeatAt = Number.NEGATIVE_INFINITY
  }

  async #carryAll(deliveries: readonly Delivery[]): Promise<boolean> {
    let carried = false
    try {
      for (const delivery of deliveries) {
        if (this.#closed) return carried
        if (await this.#carry(delivery)) carried = true
      }
      await this.#repeat()
    } catch (error) {
      // The store refused: the message is still in the outbox and will be carried again.
      this.#fail(null, `outbox: ${error}`)
    }
    return carried
  }

  /** True when the delivery has left the outbox. */
  async #carry(delivery: Delivery): Promise<boolean> {
    const { store, now, report, log } = this.#parts
    if (this.#isOver(delivery, now())) {
      giveUp(this.#parts, delivery, now(), delivery.lastError ?? 'the route does not answer')
      return true
    }
    if (now() < this.#shutUntil) return false
    const attempt = await this.#guarded(() =>
      this.#route.send(delivery.payload as Message, now(), this.#signal),
    )
    if (attempt.ok) {
      settle(
        this.#parts,
        { ...delivery, attempts: delivery.attempts + 1 },
        now(),
        'delivered',
        attempt.detail,
      )
      this.#succeed()
      return true
    }
    if (this.#signal.aborted) return false
    const attempts = delivery.attempts + 1
    report({ route: this.#route.name, what: 'alert', outcome: 'failed', detail: attempt.detail })
    if (attempt.routeWide) this.#fail(attempt.retryAfterMs, attempt.detail)
    else {
      this.#succeed()
      const { alert, version } = delivery
      log('warn', 'The route refuses this alert; it is tried again.', {
        route: this.#route.name,
        alert,
        version,
        detail: attempt.detail,
      })
    }
    if (now() >= delivery.giveUpAt) {
      giveUp(this.#parts, { ...delivery, attempts }, now(), attempt.detail)
      return true
    }
    const next = Math.min(this.#nextTry(attempts, attempt.retryAfterMs), delivery.giveUpAt)
    store.retryAt(delivery.key, attempts, next, attempt.detail)
    return false
  }

  /** An alert that has a version waiting is left out: it will be told in order, through the outbox. */
  async #repeat(): Promise<void> {
    const { store, standing, now, report } = this.#parts
    const every = this.#route.resendEveryMs
    if (this.#closed || every === null || now() < this.#repeatAt || now() < this.#shutUntil) return
    const waiting = store.waitingAlerts(this.#route.name)
    const alerts = standing(now()).filter(({ id }) => !waiting.has(id))
    const attempt = await this.#guarded(() => this.#route.resend(alerts, now(), this.#signal))
    if (attempt === null || attempt.ok) {
      this.#repeatAt = now() + every
      if (attempt !== null) this.#succeed()
      return
    }
    if (this.#signal.aborted) return
    report({ route: this.#route.name, what: 'repetition', outcome: 'failed', detail: attempt.detail })
    if (attempt.routeWide) this.#fail(attempt.retryAfterMs, attempt.detail)
    else this.#repeatAt = now() + every
  }

  /** Its time is over, and the route is known to be down: a last try would tell nothing new. */
  #isOver(delivery: Delivery, now: number): boolean {
    return now >= delivery.giveUpAt && this.#failures > 0 && now - this.#lastFailure < freshFailureMs
  }

  #nextTry(failures: number, retryAfterMs: number | null): number {
    const { now, random, backoff } = this.#parts
    return now() + Math.max(backoffMs(failures, random(), backoff ?? defaultBackoff), retryAfterMs ?? 0)
  }

  #fail(retryAfterMs: number | null, detail: string): void {
    this.#failures++
    this.#lastFailure = this.#parts.now()
    this.#shutUntil = this.#nextTry(this.#failures, retryAfterMs)
    if (this.#failures === 1)
      this.#parts.log('warn', 'The route takes no alerts; they wait in the outbox.', {
        route: this.#route.name,
        detail,
      })
  }

  #succeed(): void {
    if (this.#failures > 0)
      this.#parts.log('info', 'The route takes alerts again.', {
        route: this.#route.name,
        failures: this.#failures,
      })
    this.#failures = 0
    this.#shutUntil = Number.NEGATIVE_INFINITY
  }

  async #guarded<T extends Attempt | null>(work: () => Promise<T>): Promise<T | Attempt> {
    try {
      return await work()
    } catch (error) {
      const words = error instanceof Error ? error.message : String(error)
      return unsent(`unexpected: ${words}`, { routeWide: false })
    }
  }
}
