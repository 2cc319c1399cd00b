/** Holds work back while it is closed. */
export class Gate {
  #held = false
  #waiting: (() => void)[] = []

  set(held: boolean): void {
    this.#held = held
    if (held) return
    const waiting = this.#waiting
    this.#waiting = []
    for (const go of waiting) go()
  }

  /** Resolves when the gate is open, or when `stop` is aborted. */
  async pass(stop: AbortSignal): Promise<void> {
    while (this.#held && !stop.aborted)
      await new Promise<void>((resolve) => {
        const go = () => {
          stop.removeEventListener('abort', go)
          resolve()
        }
        this.#waiting.push(go)
        stop.addEventListener('abort', go, { once: true })
      })
  }
}
