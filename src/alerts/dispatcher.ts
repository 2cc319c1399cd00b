import type { Delivery } from '../store/store.ts'
import { Lane } from './lane.ts'
import { type DispatcherParts, giveUp } from './settlement.ts'

/** How many deliveries of each route are taken in hand at once. */
const batch = 32
/** A wall clock that goes back by more than this was set back. */
const setBackMs = 2000
/** How long a delivery waits whose route the settings do not name. */
const strangerWaitMs = 60_000

/**
 * Carries the outbox to the routes. Each route has a lane of its own, so that one that is down holds up no
 * other; within a lane one message travels at a time, and of one alert the versions go in order. A delivery
 * leaves the outbox when the route has taken it or its time is over, which is logged, journalled and
 * reported. A crash between the two repeats a message and loses none.
 */
export class Dispatcher {
  readonly #parts: DispatcherParts
  readonly #lanes: ReadonlyMap<string, Lane>
  readonly #stopping = new AbortController()
  #cancel: (() => void) | null = null
  #running = false
  #lastNow = Number.NEGATIVE_INFINITY

  constructor(parts: DispatcherParts) {
    this.#parts = parts
    this.#lanes = new Map(
      parts.routes.map((route) => [route.name, new Lane(route, parts, this.#stopping.signal)]),
    )
  }

  start(): void {
    if (this.#running || this.#stopping.signal.aborted) return
    this.#running = true
    this.poke()
  }

  /** Looks at the outbox now. */
  poke(): void {
    if (!this.#running) return
    this.#cancel?.()
    try {
      this.#look()
    } catch (error) {
      this.#parts.log('error', 'The outbox cannot be read; trying again.', { error: String(error) })
    }
    this.#cancel = this.#parts.after(this.#parts.pollMs ?? 1000, () => this.poke())
  }

  /**
   * Takes nothing new in hand, and resolves when what is in hand has come to its end, or has been cut off
   * after `graceMs`: it then stays in the outbox.
   */
  async stop(graceMs = 5000): Promise<void> {
    this.#running = false
    this.#cancel?.()
    this.#cancel = null
    for (const lane of this.#lanes.values()) lane.close()
    const cancelGrace = this.#parts.after(graceMs, () => this.#stopping.abort())
    await Promise.all([...this.#lanes.values()].map((lane) => lane.idle()))
    cancelGrace()
    this.#stopping.abort()
  }

  #look(): void {
    const { store } = this.#parts
    const now = this.#parts.now()
    if (now < this.#lastNow - setBackMs) {
      store.hasten(now)
      for (const lane of this.#lanes.values()) lane.forgetWaits()
    }
    this.#lastNow = now

    const mine = new Map<string, Delivery[]>([...this.#lanes.keys()].map((name) => [name, []]))
    for (const delivery of store.due(now, batch * (this.#lanes.size + 1))) {
      const lane = mine.get(delivery.route)
      if (lane === undefined) this.#keepForStranger(delivery, now)
      else if (lane.length < batch) lane.push(delivery)
    }
    for (const [name, deliveries] of mine) {
      const lane = this.#lanes.get(name)!
      // More may have become due behind what the lane has just carried.
      lane.take(deliveries, now)?.then(
        (carried) => carried && this.poke(),
        () => {},
      )
    }
  }

  /** The settings may name the route again at the next start, so its deliveries wait until their time is over. */
  #keepForStranger(delivery: Delivery, now: number): void {
    const detail = `no route is called ${delivery.route}`
    if (now < delivery.giveUpAt) {
      const next = Math.min(now + strangerWaitMs, delivery.giveUpAt)
      this.#parts.store.retryAt(delivery.key, delivery.attempts, next, detail)
    } else giveUp(this.#parts, delivery, now, detail)
  }
}
