import { interval, NEVER } from 'rxjs'
import type { Drive } from '../pipeline.ts'

/** Milliseconds of computing between two breaths of the event loop. */
export const longestSlice = 8

/** The clocks of the machine. `beatMs`: time between beats; null for none (replay keeps no time). */
export function systemDrive(now: () => number, beatMs: number | null): Drive {
  return {
    now,
    lap: () => performance.now(),
    breathe: () => new Promise((resolve) => setImmediate(resolve)),
    beats: beatMs === null ? NEVER : interval(beatMs),
  }
}

/** Calls back after so many milliseconds; what it returns takes the order back. */
export function after(ms: number, callback: () => void): () => void {
  const timer = setTimeout(callback, ms)
  return () => clearTimeout(timer)
}
