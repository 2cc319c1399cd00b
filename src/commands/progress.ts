import { SingleBar } from 'cli-progress'
import type { Outcome } from '../pipeline.ts'
import type { Surroundings } from './commands.ts'

/** Progress of a replay on a terminal: share of the bytes, rate, time left. Silent elsewhere. */
export class Progress {
  readonly #bar: SingleBar | null
  readonly #now: () => number
  readonly #started: number
  /** Bytes still to be read, by source, and the most there ever were. */
  readonly #behind = new Map<string, { left: number; most: number }>()
  #readings = 0
  #begun = false

  constructor({ stderr, env }: Surroundings, now: () => number) {
    this.#now = now
    this.#started = now()
    const colour = (env as NodeJS.ProcessEnv).NO_COLOR === undefined
    this.#bar = stderr.isTTY
      ? new SingleBar({
          stream: stderr as NodeJS.WriteStream,
          format: '{bar} {percentage} %  {rate} readings/s  {left} left',
          barCompleteChar: colour ? '━' : '=',
          barIncompleteChar: colour ? '─' : '-',
          hideCursor: true,
          clearOnComplete: true,
          etaBuffer: 50,
        })
      : null
  }

  take({ arrival: { feed, event } }: Outcome): void {
    if (this.#bar === null || feed === null || event.type !== 'batch') return
    this.#readings += event.batch.count
    if (event.behind === null) return
    const key = `${feed.name}/${event.source}`
    const before = this.#behind.get(key)?.most ?? 0
    this.#behind.set(key, { left: event.behind, most: Math.max(before, event.behind) })
    let left = 0
    let most = 0
    for (const source of this.#behind.values()) {
      left += source.left
      most += source.most
    }
    const seconds = Math.max(1e-3, (this.#now() - this.#started) / 1000)
    const done = most - left
    const payload = {
      rate: Math.round(this.#readings / seconds).toLocaleString('en'),
      left: done > 0 ? spoken((left * seconds) / done) : '…',
    }
    if (!this.#begun) {
      this.#begun = true
      this.#bar.start(most, done, payload)
    } else {
      this.#bar.setTotal(most)
      this.#bar.update(done, payload)
    }
  }

  end(): void {
    if (this.#begun) this.#bar?.stop()
  }
}

function spoken(seconds: number): string {
  if (seconds < 60) return `${Math.ceil(seconds)} s`
  return seconds < 3600 ? `${Math.ceil(seconds / 60)} min` : `${(seconds / 3600).toFixed(1)} h`
}
