import type { DropCounts } from '../reasons.ts'
import type { Finding, Frame } from './frame.ts'
import type { Increment } from './increments.ts'
import type { MemoryChoice } from './memory.ts'
import type { SignalChoice } from './roster.ts'
import type { SessionChoice } from './sessions.ts'

/** How readings of an ensemble become its frames. */
export interface FrameOptions {
  readonly signals: SignalChoice
  /** Milliseconds, or `row`. */
  readonly step: number | 'row'
  /** Milliseconds that a step stays open for readings that come late. */
  readonly lateness: number
  /** Milliseconds; null: 12 steps, with `row` the row itself. */
  readonly staleAfter: number | null
  /** Milliseconds of processing time. */
  readonly idleAfter: number
  /** Milliseconds that a reading may lie ahead of the present. */
  readonly ahead: number
  readonly sessions: SessionChoice | null
  readonly increment: Increment
  /** Steps of the exponential mean that `level` is taken from. */
  readonly levelSpan: number
  readonly memory: MemoryChoice
  /** Steps that an autoregression is fitted to. */
  readonly fitOver: number
  readonly commonVolatility: 'remove' | 'keep'
  /** Robust standard deviations; null: no truncation. */
  readonly truncateAt: number | null
  /** Frames that a signal's own scale rests on. */
  readonly scaleSpan: number
  /** Frames after which scales are fixed; null: they follow. */
  readonly scaleFixedAfter: number | null
  readonly stuckAfter: number | null
}

/** Readings as columns: see feeds/feed.ts. */
export interface Columns {
  readonly count: number
  readonly names: readonly string[]
  readonly signal: Int32Array
  readonly time: Float64Array
  readonly value: Float64Array
}

/** What came of one call: the frames that it closed, what was found on the way, readings not taken. */
export interface Made {
  readonly frames: Frame[]
  readonly findings: readonly Finding[]
  readonly dropped: DropCounts
}
