import type { PageChange, PageView } from './view.ts'

/** The part of a server response that a stream needs. */
export interface StreamOut {
  write(text: string): boolean
  end(): void
  destroy(): void
  /** Bytes written that the reader has not taken yet. */
  readonly writableLength: number
}

export interface StreamLimits {
  readonly clients: number
  /** Changes kept for those that come back, and their characters together. */
  readonly kept: number
  readonly keptCharacters: number
  /** Bytes that a reader may leave lying, besides its two largest events, before it is let go; it may come back. */
  readonly waiting: number
}

export const usualLimits: StreamLimits = {
  clients: 64,
  kept: 240,
  keptCharacters: 4_000_000,
  waiting: 1_000_000,
}

/** Time after which a browser comes back by itself. */
const retryMs = 1000

/**
 * Server-sent events (WHATWG HTML, section 9.2) to all open pages. One that comes back with the id of its
 * last event gets what it has missed, while that is kept, else the whole state. A reader that does not keep
 * up is let go: nothing piles up for it.
 */
export class EventStreams {
  readonly #run: string
  readonly #limits: StreamLimits
  /** Each reader with the length of the largest event that it was sent. */
  readonly #clients = new Map<StreamOut, number>()
  #kept: { readonly number: number; readonly text: string }[] = []
  #keptCharacters = 0
  #number = 0
  #letGo = 0

  /** `run`: differs between any two runs of the server, so that an id of another one is not mistaken. */
  constructor(run: string, limits: StreamLimits = usualLimits) {
    this.#run = run
    this.#limits = limits
  }

  get clients(): number {
    return this.#clients.size
  }

  /** How many were let go because they did not keep up. */
  get letGo(): number {
    return this.#letGo
  }

  get full(): boolean {
    return this.#clients.size >= this.#limits.clients
  }

  /** `lastId`: id of the last event that the reader has seen, as it states it. */
  open(out: StreamOut, lastId: string | null, view: () => PageView): void {
    const missed = this.#since(lastId)
    const first = missed ?? event('state', view(), `${this.#run}-${this.#number}`)
    this.#clients.set(out, 0)
    this.#write(out, `retry: ${retryMs}\n\n${first}`)
  }

  gone(out: StreamOut): void {
    this.#clients.delete(out)
  }

  publish(change: PageChange): void {
    this.#number++
    const text = event('change', change, `${this.#run}-${this.#number}`)
    this.#kept.push({ number: this.#number, text })
    this.#keptCharacters += text.length
    while (this.#kept.length > this.#limits.kept || this.#keptCharacters > this.#limits.keptCharacters) {
      this.#keptCharacters -= this.#kept.shift()?.text.length ?? 0
    }
    for (const out of [...this.#clients.keys()]) this.#write(out, text)
  }

  /** A sign of life that the page can hear, with the time of the monitor; it has no id. */
  beat(now: number): void {
    for (const out of [...this.#clients.keys()]) this.#write(out, event('beat', { now }))
  }

  close(): void {
    for (const out of this.#clients.keys()) out.end()
    this.#clients.clear()
  }

  #write(out: StreamOut, text: string): void {
    // An event larger than the allowance must not end the stream of one that keeps up.
    const largest = Math.max(text.length, this.#clients.get(out) ?? 0)
    this.#clients.set(out, largest)
    out.write(text)
    if (out.writableLength <= this.#limits.waiting + 2 * largest) return
    this.#clients.delete(out)
    this.#letGo++
    out.destroy()
  }

  /** What came behind `lastId`; null where that is not known any more. */
  #since(lastId: string | null): string | null {
    const [, run, digits] = /^(.+)-(\d{1,15})$/.exec(lastId ?? '') ?? []
    if (run !== this.#run) return null
    const number = Number(digits)
    const oldest = this.#kept[0]?.number ?? this.#number + 1
    if (number > this.#number || number + 1 < oldest) return null
    const missed = this.#kept.filter((kept) => kept.number > number).map(({ text }) => text)
    return missed.join('')
  }
}

/** JSON has no raw line breaks, so that one `data` line holds all of it. */
const event = (name: string, data: unknown, id?: string): string =>
  `${id === undefined ? '' : `id: ${id}\n`}event: ${name}\ndata: ${JSON.stringify(data)}\n\n`
