import { setImmediate as breathe } from 'node:timers/promises'

/** A clock and a timer that only move when told to. */
export class FakeTime {
  #now: number
  #orders: { at: number; callback: () => void }[] = []

  constructor(now = Date.UTC(2026, 10, 2, 10, 42)) {
    this.#now = now
  }

  readonly now = (): number => this.#now

  readonly after = (ms: number, callback: () => void): (() => void) => {
    const order = { at: this.#now + ms, callback }
    this.#orders.push(order)
    return () => {
      this.#orders = this.#orders.filter((other) => other !== order)
    }
  }

  /** How many orders wait. */
  get pending(): number {
    return this.#orders.length
  }

  /** Moves on, carrying out what falls due in its order, and lets promises settle after each. */
  async advance(ms: number): Promise<void> {
    const end = this.#now + ms
    await settle()
    for (;;) {
      const [first] = this.#orders.filter(({ at }) => at <= end).sort((a, b) => a.at - b.at)
      if (first === undefined) break
      this.#orders = this.#orders.filter((other) => other !== first)
      this.#now = Math.max(this.#now, first.at)
      first.callback()
      await settle()
    }
    this.#now = end
  }

  /** Sets the clock without any time passing. */
  setBack(ms: number): void {
    this.#now -= ms
    for (const order of this.#orders) order.at -= ms
  }
}

async function settle(): Promise<void> {
  for (let i = 0; i < 3; i++) await breathe()
}
