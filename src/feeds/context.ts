import type { Readable } from 'node:stream'
import type { Position } from './feed.ts'

/** Where a feed says what happened to it; `fields` are plain data. */
export type FeedLog = (
  level: 'debug' | 'info' | 'warn' | 'error',
  message: string,
  fields?: Readonly<Record<string, unknown>>,
) => void

/** The passing of time, for pace and back-off. */
export interface FeedTimer {
  /** Milliseconds of a clock that never steps. */
  lap(): number
  /** Resolves after `milliseconds`, or at once when `signal` is aborted; never rejects. */
  wait(milliseconds: number, signal: AbortSignal): Promise<void>
}

/** What a feed is given from outside. */
export interface FeedContext {
  /** Milliseconds since 1970 UTC. */
  now(): number
  readonly log: FeedLog
  /** Positions of the last run's batches, entries of all its sources together. */
  readonly resumeAt?: Position
  /** Default: the clock of the machine. */
  readonly timer?: FeedTimer
  /** Default: the standard input of the process. */
  readonly stdin?: Readable
}

const longestTimeout = 2 ** 31 - 1

export const systemTimer: FeedTimer = {
  lap: () => performance.now(),
  wait: (milliseconds, signal) =>
    new Promise((resolve) => {
      if (signal.aborted) return resolve()
      const end = () => {
        clearTimeout(timer)
        signal.removeEventListener('abort', end)
        resolve()
      }
      const timer = setTimeout(end, Math.min(Math.max(0, milliseconds), longestTimeout))
      signal.addEventListener('abort', end, { once: true })
    }),
}
