import { Observable, type Subscriber } from 'rxjs'
import { type FeedContext, type FeedTimer, systemTimer } from './context.ts'
import type { Feed, FeedEvent, Position } from './feed.ts'
import { Gate } from './gate.ts'
import { handOver } from './hand-over.ts'
import { Pace } from './pace.ts'

/** Readings as columns, as a generator makes them. */
export interface GeneratedChunk {
  readonly count: number
  /** The same list in every chunk; it may grow. */
  readonly names: readonly string[]
  readonly signal: Int32Array
  /** Event times, milliseconds since 1970 UTC. */
  readonly time: Float64Array
  readonly value: Float64Array
  /** Event time at which the chunk is due. */
  readonly until: number
}

/**
 * Plays invented readings, arriving at `speed` times real time (Infinity: as fast as the listener takes
 * them). The speed may be set while it plays. Each subscription plays `chunks` from where they stand: give a
 * generator for one play, an array or the like for several.
 */
export class GeneratedFeed implements Feed {
  readonly name: string
  readonly kind = 'generated'
  readonly events: Observable<FeedEvent>
  readonly #chunks: Iterable<GeneratedChunk>
  readonly #gate = new Gate()
  readonly #pace: Pace
  readonly #timer: FeedTimer

  constructor(
    name: string,
    chunks: Iterable<GeneratedChunk>,
    speed: number,
    context: Pick<FeedContext, 'timer'> = {},
  ) {
    this.name = name
    this.#chunks = chunks
    this.#timer = context.timer ?? systemTimer
    this.#pace = new Pace(speed, this.#timer)
    this.events = new Observable((subscriber) => {
      const stop = new AbortController()
      this.#play(subscriber, stop.signal).catch((error) => subscriber.error(error))
      return () => stop.abort()
    })
  }

  /** Event time over real time. */
  get speed(): number {
    return this.#pace.speed
  }

  /** Raises RangeError below 0; 0 stands still. */
  set speed(speed: number) {
    this.#pace.speed = speed
  }

  hold(source: string, held: boolean): void {
    if (source === this.name) this.#gate.set(held)
  }

  async commit(_position: Position): Promise<void> {}

  async check(): Promise<{ readonly ok: boolean; readonly detail: string }> {
    return { ok: true, detail: 'invented readings' }
  }

  async #play(to: Subscriber<FeedEvent>, stop: AbortSignal): Promise<void> {
    const source = this.name
    to.next({ type: 'connected' })
    to.next({ type: 'assigned', sources: [source] })
    let breath = this.#timer.lap()
    for (const { count, names, signal, time, value, until } of this.#chunks) {
      await this.#pace.due(until, stop)
      await this.#gate.pass(stop)
      if (stop.aborted) return
      const batch = { count, names, signal, time, value, dropped: {} }
      await handOver(
        to,
        { source, batch, quarantined: [], position: { [source]: String(until) }, behind: null },
        stop,
      )
      if (this.#timer.lap() - breath > 10) {
        await new Promise((resolve) => setImmediate(resolve))
        breath = this.#timer.lap()
      }
    }
    to.next({ type: 'caught-up', source })
    to.next({ type: 'ended', source })
    to.complete()
  }
}
