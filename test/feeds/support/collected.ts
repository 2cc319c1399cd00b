import type { Subscription } from 'rxjs'
import type { Feed, FeedEvent, Position, QuarantinedRecord } from '../../../src/feeds/feed.ts'
import { addDrops, type DropCounts } from '../../../src/reasons.ts'

export interface Reading {
  readonly source: string
  readonly signal: string
  readonly time: number
  readonly value: number
}

/** Listens to a feed and keeps all that it says. */
export class Collected {
  readonly readings: Reading[] = []
  readonly events: FeedEvent['type'][] = []
  readonly quarantined: QuarantinedRecord[] = []
  readonly sizes: number[] = []
  readonly assigned: string[] = []
  readonly revoked: string[] = []
  readonly caughtUp: string[] = []
  readonly details: string[] = []
  dropped: DropCounts = {}
  position: Position = {}
  behind: number | null = null
  error: unknown = null
  completed = false
  readonly #subscription: Subscription
  readonly ended: Promise<void>

  /** `before`: called with each batch; the batch is done when it resolves. */
  constructor(feed: Feed, before: (event: FeedEvent & { type: 'batch' }) => void | Promise<void> = () => {}) {
    let end = () => {}
    this.ended = new Promise((resolve) => {
      end = resolve
    })
    this.#subscription = feed.events.subscribe({
      next: (event) => {
        this.events.push(event.type)
        if (event.type === 'assigned') this.assigned.push(...event.sources)
        if (event.type === 'revoked') this.revoked.push(...event.sources)
        if (event.type === 'caught-up') this.caughtUp.push(event.source)
        if (event.type === 'disconnected') this.details.push(event.detail)
        if (event.type !== 'batch') return
        const waited = before(event)
        if (waited === undefined) this.#take(event)
        else void waited.then(() => this.#take(event))
      },
      error: (error) => {
        this.error = error
        end()
      },
      complete: () => {
        this.completed = true
        end()
      },
    })
  }

  #take(event: FeedEvent & { type: 'batch' }): void {
    const { source, batch, quarantined, position, behind } = event
    this.sizes.push(batch.count)
    for (let i = 0; i < batch.count; i++)
      this.readings.push({
        source,
        signal: batch.names[batch.signal[i]!]!,
        time: batch.time[i]!,
        value: batch.value[i]!,
      })
    this.dropped = addDrops(this.dropped, batch.dropped)
    this.quarantined.push(...quarantined)
    this.position = { ...this.position, ...position }
    this.behind = behind
    event.done()
  }

  stop(): void {
    this.#subscription.unsubscribe()
  }
}
