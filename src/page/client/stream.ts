import type { PageChange, PageView } from '../view.ts'

/** Silence after which the stream counts as lost; the monitor gives a sign of life every two seconds. */
export const lostAfterMs = 4500
const retryMs = [500, 1000, 2000, 3000]

export interface StreamListener {
  state(view: PageView): void
  change(change: PageChange): void
  /** The present by the clock of the monitor. */
  time(now: number): void
  lost(): void
  back(): void
}

/**
 * The stream of events, opened again and again for as long as the page lives. The browser's own way of coming back is not
 * relied upon: it gives up on an error status and does not notice a connection that has only fallen silent.
 */
export class Stream {
  readonly #listener: StreamListener
  #source: EventSource | null = null
  #lastId = ''
  #heardAt = performance.now()
  #isLost = false
  #attempts = 0
  #retry: ReturnType<typeof setTimeout> | null = null

  constructor(listener: StreamListener) {
    this.#listener = listener
    setInterval(() => this.#watch(), 250)
    addEventListener('online', () => this.#again(0))
    this.#open()
  }

  #open(): void {
    this.#retry = null
    const after = this.#lastId === '' ? '' : `?after=${encodeURIComponent(this.#lastId)}`
    const source = new EventSource(`/events${after}`)
    this.#source = source
    this.#heardAt = performance.now()
    const on = (name: string, take: (data: never) => void) =>
      source.addEventListener(name, (event) => {
        if (source !== this.#source) return
        if (event.lastEventId !== '') this.#lastId = event.lastEventId
        this.#heard()
        take(JSON.parse(event.data) as never)
      })
    on('state', (view: PageView) => {
      this.#listener.state(view)
      this.#listener.time(view.now)
    })
    on('change', (change: PageChange) => {
      this.#listener.change(change)
      this.#listener.time(change.now)
    })
    on('beat', ({ now }: { readonly now: number }) => this.#listener.time(now))
    source.addEventListener('error', () => {
      if (source !== this.#source) return
      this.#lose()
      this.#again(retryMs[Math.min(this.#attempts++, retryMs.length - 1)] ?? 3000)
    })
  }

  #heard(): void {
    this.#heardAt = performance.now()
    this.#attempts = 0
    if (!this.#isLost) return
    this.#isLost = false
    this.#listener.back()
  }

  #lose(): void {
    if (this.#isLost) return
    this.#isLost = true
    this.#listener.lost()
  }

  #again(ms: number): void {
    this.#source?.close()
    this.#source = null
    if (this.#retry !== null) clearTimeout(this.#retry)
    this.#retry = setTimeout(() => this.#open(), ms)
  }

  #watch(): void {
    if (this.#source === null || performance.now() - this.#heardAt < lostAfterMs) return
    this.#lose()
    this.#again(0)
  }
}
