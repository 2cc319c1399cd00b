import type { FeedTimer } from '../../../src/feeds/context.ts'

/** A clock that stands still until it is told to go on. */
export class FakeTimer implements FeedTimer {
  #now = 0
  #waiting: { at: number; go: () => void }[] = []

  lap(): number {
    return this.#now
  }

  wait(milliseconds: number, signal: AbortSignal): Promise<void> {
    return new Promise((resolve) => {
      if (signal.aborted) return resolve()
      const entry = { at: this.#now + milliseconds, go: resolve }
      this.#waiting.push(entry)
      signal.addEventListener('abort', () => {
        this.#waiting = this.#waiting.filter((other) => other !== entry)
        resolve()
      })
    })
  }

  /** Lets so much time pass, and everything that was due in it happen. */
  async pass(milliseconds: number): Promise<void> {
    const end = this.#now + milliseconds
    for (;;) {
      await settled()
      const next = this.#waiting.filter(({ at }) => at <= end).sort((a, b) => a.at - b.at)[0]
      if (next === undefined) break
      this.#waiting = this.#waiting.filter((other) => other !== next)
      this.#now = Math.max(this.#now, next.at)
      next.go()
    }
    this.#now = end
  }
}

/** Lets all that is ready run. */
export async function settled(): Promise<void> {
  for (let i = 0; i < 5; i++) await new Promise((resolve) => setImmediate(resolve))
}
