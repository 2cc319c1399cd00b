import type { ParseArgsConfig } from 'node:util'
import { type DemoChunk, type DemoClock, defaultClock, roundFrames } from './demo-feed.ts'
import { deskEvents, deskReadings } from './desk.ts'
import { stationEvents, stationReadings } from './station.ts'

/** Options that both scripts of this folder take. */
export const clockOptions = {
  feed: { type: 'string', default: 'desk' },
  seed: { type: 'string', default: String(defaultClock.seed) },
  start: { type: 'string' },
  step: { type: 'string', default: String(defaultClock.stepMs) },
  frames: { type: 'string', default: String(defaultClock.frames) },
  lateness: { type: 'string', default: String(defaultClock.latenessMs) },
  help: { type: 'boolean', default: false },
} as const satisfies ParseArgsConfig['options']

export const clockHelp = `  --feed NAME       desk or station (default desk)
  --seed N          whole number; the same seed gives the same readings (default ${defaultClock.seed})
  --start TIME      RFC 3339
  --step MS         length of a frame, milliseconds (default ${defaultClock.stepMs})
  --frames N        how many frames (default ${defaultClock.frames}, one round of events)
  --lateness MS     readings come at most this late, milliseconds (default ${defaultClock.latenessMs})`

interface ClockTexts {
  readonly feed: string
  readonly seed: string
  readonly start?: string | undefined
  readonly step: string
  readonly frames: string
  readonly lateness: string
}

function wholeNumber(name: string, text: string, least: number): number {
  const number = Number(text)
  if (!Number.isSafeInteger(number) || number < least)
    throw new Error(`--${name} takes a whole number of at least ${least}, not "${text}"`)
  return number
}

/** Times as the options state them; `start` falls back to `startOf(length of the whole run in ms)`. */
export function clockFrom(texts: ClockTexts, startOf: (lengthMs: number) => number): DemoClock {
  const stepMs = wholeNumber('step', texts.step, 10)
  const frames = wholeNumber('frames', texts.frames, 1)
  const stated = texts.start === undefined ? startOf(frames * stepMs) : Date.parse(texts.start)
  if (!Number.isFinite(stated)) throw new Error(`--start takes a time such as 2026-11-02T09:00:00+01:00`)
  return {
    seed: wholeNumber('seed', texts.seed, 0),
    start: Math.floor(stated / stepMs) * stepMs,
    stepMs,
    frames,
    latenessMs: wholeNumber('lateness', texts.lateness, 0),
  }
}

/** The readings of the named feed with as many rounds of events as the frames hold. */
export function readingsOf(feed: string, clock: DemoClock): Generator<DemoChunk> {
  const rounds = Math.ceil(clock.frames / roundFrames)
  if (feed === 'desk') return deskReadings(clock, deskEvents(rounds))
  if (feed === 'station') return stationReadings(clock, stationEvents(rounds))
  throw new Error(`--feed takes desk or station, not "${feed}"`)
}
