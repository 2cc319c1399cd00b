import type { FindingKind } from '../src/reasons.ts'
import type { ShiftKind } from '../src/regime/regime.ts'

/** When a demo feed runs. Frame k spans [start + k·stepMs, start + (k+1)·stepMs). */
export interface DemoClock {
  readonly seed: number
  /** Milliseconds since 1970 UTC; a multiple of `stepMs`. */
  readonly start: number
  /** Length of a frame in milliseconds of event time. */
  readonly stepMs: number
  /** How many frames to make; Infinity for a feed without end. */
  readonly frames: number
  /** No reading arrives later than this behind its event time, milliseconds. */
  readonly latenessMs: number
}

/** Monday 2 November 2026, 09:00 in Oslo; 5,400 frames of 5 s are the 7.5 hours of one round of events. */
export const defaultClock: DemoClock = {
  seed: 48,
  start: Date.UTC(2026, 10, 2, 8),
  stepMs: 5000,
  frames: 5400,
  latenessMs: 2000,
}

/** Frames of one round of planted events: at 60 frames a second (speed 300) it plays in 90 s. */
export const roundFrames = 5400

export type PlantedKind =
  | 'flash-print'
  | 'volatility-burst'
  | 'lull'
  | 'market-mode-spike'
  | 'rotation'
  | 'stuck'
  | 'fouling'
  | 'change-over'

/** Something that the generator does to the feed, and what the monitor is expected to say about it. */
export interface PlantedEvent {
  readonly ensemble: 'desk' | 'station'
  readonly what: PlantedKind
  /** First frame that differs. */
  readonly from: number
  /** First frame that is as before again; null when it lasts. */
  readonly to: number | null
  /**
   * `nothing`: no shift and no page. `finding`: a finding about the signal, no shift. `planned`: a new
   * reference without a page. `shift`: a confirmed shift, and a second one when it ends, unless a planned
   * change covers that.
   */
  readonly expected: 'shift' | 'finding' | 'nothing' | 'planned'
  readonly kind: ShiftKind | null
  readonly finding: FindingKind | null
  /** The signals it happens to; empty when to all. */
  readonly signals: readonly string[]
  /** What a visitor of the demo is told. */
  readonly sentence: string
}

/** Event times of a planted event, milliseconds since 1970 UTC. */
export const plantedTimes = (
  event: PlantedEvent,
  clock: Pick<DemoClock, 'start' | 'stepMs'>,
): { from: number; to: number | null } => ({
  from: clock.start + event.from * clock.stepMs,
  to: event.to === null ? null : clock.start + event.to * clock.stepMs,
})

/** The event of this kind that is under way in this frame, if any. */
export const underWay = (
  events: readonly PlantedEvent[],
  what: PlantedKind,
  frame: number,
): PlantedEvent | undefined =>
  events.find((event) => event.what === what && event.from <= frame && (event.to ?? Infinity) > frame)

/** Readings as columns, in order of arrival: all that arrive within one frame's span of time. */
export interface DemoChunk {
  readonly frame: number
  /** End of the span, milliseconds since 1970 UTC. */
  readonly until: number
  readonly count: number
  readonly names: readonly string[]
  readonly signal: Int32Array
  /** Event time, whole milliseconds since 1970 UTC. */
  readonly time: Float64Array
  readonly value: Float64Array
  /** When the reading arrives, milliseconds since 1970 UTC; at least `time`. */
  readonly arrival: Float64Array
}

/** Holds readings until their arrival and gives them out in its order. */
export class ArrivalQueue {
  readonly #names: readonly string[]
  #signal: number[] = []
  #time: number[] = []
  #value: number[] = []
  #arrival: number[] = []

  constructor(names: readonly string[]) {
    this.#names = names
  }

  put(signal: number, time: number, value: number, arrival: number): void {
    this.#signal.push(signal)
    this.#time.push(time)
    this.#value.push(value)
    this.#arrival.push(arrival)
  }

  /** What arrives before `until`; the rest stays. */
  take(frame: number, until: number): DemoChunk {
    const arrivals = this.#arrival
    const due: number[] = []
    const rest: number[] = []
    for (let i = 0; i < arrivals.length; i++) (arrivals[i]! < until ? due : rest).push(i)
    due.sort((a, b) => arrivals[a]! - arrivals[b]! || a - b)
    const chunk = {
      frame,
      until,
      count: due.length,
      names: this.#names,
      signal: Int32Array.from(due, (i) => this.#signal[i]!),
      time: Float64Array.from(due, (i) => this.#time[i]!),
      value: Float64Array.from(due, (i) => this.#value[i]!),
      arrival: Float64Array.from(due, (i) => arrivals[i]!),
    }
    this.#signal = rest.map((i) => this.#signal[i]!)
    this.#time = rest.map((i) => this.#time[i]!)
    this.#value = rest.map((i) => this.#value[i]!)
    this.#arrival = rest.map((i) => arrivals[i]!)
    return chunk
  }
}
