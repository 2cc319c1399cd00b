import type { Levels } from './aligner.ts'
import { EppsCheck, type EppsComparison, type EppsSnapshot } from './epps.ts'
import type { Frame } from './frame.ts'
import type { FrameOptions } from './frame-options.ts'
import type { Hygiene } from './hygiene.ts'
import { type IncrementSnapshot, type Increments, IncrementTaker } from './increments.ts'
import { Memory, type MemorySnapshot } from './memory.ts'
import type { Roster } from './roster.ts'
import { type Scaled, Scaler, type ScalerSnapshot } from './scaler.ts'

/**
 * The levels of a step become a frame: increments, memory, scale, common volatility, truncation. Steps in
 * which no signal has an increment, or in which the scales are not known yet, make none: the first frame is
 * the first that is fit for a window, in which at least half of the moving signals have a scale.
 */
export class FrameBuilder {
  readonly #roster: Roster
  readonly #hygiene: Hygiene
  readonly #increments: IncrementTaker
  readonly #memory: Memory
  readonly #scaler: Scaler
  readonly #epps = new EppsCheck()
  #next = 0
  /** By place: 1 where present in the frame, and where clipped. */
  #present = new Uint8Array(0)
  #clipped = new Uint8Array(0)

  constructor(options: FrameOptions, roster: Roster, hygiene: Hygiene) {
    this.#roster = roster
    this.#hygiene = hygiene
    this.#increments = new IncrementTaker(options.increment, options.levelSpan)
    this.#memory = new Memory(options.memory, options.fitOver)
    this.#scaler = new Scaler({
      span: options.scaleSpan,
      fixedAfter: options.scaleFixedAfter,
      commonVolatility: options.commonVolatility,
      truncateAt: options.truncateAt,
    })
  }

  get effectiveShare(): number {
    return this.#memory.effectiveShare
  }

  get comparison(): EppsComparison | null {
    return this.#epps.comparison
  }

  get warning(): string | null {
    return this.#epps.warning
  }

  /** null where the step makes no frame. */
  build(levels: Levels): Frame | null {
    const increments = this.#increments.take(levels, this.#hygiene.withheld)
    if (!increments.any) {
      this.#memory.interrupt()
      this.#epps.interrupt()
      return null
    }
    this.#enrol(increments, levels.places)
    const n = this.#roster.names.length
    const x = new Float64Array(n)
    const present = new Uint8Array(n)
    for (let i = 0; i < n; i++) {
      const place = this.#roster.placeAt(i)
      x[i] = increments.value[place]!
      present[i] = increments.has[place]!
    }
    const raw = this.#memory.remembers ? x.slice() : x
    this.#memory.apply(x, present)
    const scaled = this.#scaler.scale(x, present)
    const count = scaled === null ? 0 : countOf(scaled.present)
    if (scaled === null || count === 0 || (this.#next === 0 && 2 * count < countOf(present))) {
      this.#epps.interrupt()
      return null
    }
    this.#epps.push(scaled.scaled, scaled.present)
    this.#tellClipped(scaled, levels)
    for (let i = 0; i < n; i++) if (scaled.present[i] === 0) raw[i] = 0
    return {
      index: this.#next++,
      time: levels.time,
      present: scaled.present,
      missing: n - count,
      increments: raw,
      scaled: scaled.scaled,
      cleaned: scaled.cleaned,
      clipped: scaled.clipped,
      volatility: scaled.volatility,
    }
  }

  #enrol({ has }: Increments, places: number): void {
    if (this.#roster.names.length === this.#roster.places) return
    const fresh: number[] = []
    for (let place = 0; place < places; place++)
      if (has[place] === 1 && this.#roster.index(place) < 0) fresh.push(place)
    this.#roster.enrol(fresh)
  }

  #tellClipped(scaled: Scaled, { places, time }: Levels): void {
    if (this.#present.length < places) {
      this.#present = new Uint8Array(places)
      this.#clipped = new Uint8Array(places)
    } else {
      this.#present.fill(0)
      this.#clipped.fill(0)
    }
    for (let i = 0; i < scaled.present.length; i++)
      this.#present[this.#roster.placeAt(i)] = scaled.present[i]!
    for (const i of scaled.clippedSignals) this.#clipped[this.#roster.placeAt(i)] = 1
    this.#hygiene.clipped(this.#present, this.#clipped, time)
  }

  snapshot(): FrameBuilderSnapshot {
    return {
      increments: this.#increments.snapshot(),
      memory: this.#memory.snapshot(),
      scaler: this.#scaler.snapshot(),
      epps: this.#epps.snapshot(),
      next: this.#next,
    }
  }

  restore(s: FrameBuilderSnapshot): void {
    this.#increments.restore(s.increments)
    this.#memory.restore(s.memory)
    this.#scaler.restore(s.scaler)
    this.#epps.restore(s.epps)
    this.#next = s.next
  }
}

export interface FrameBuilderSnapshot {
  readonly increments: IncrementSnapshot
  readonly memory: MemorySnapshot
  readonly scaler: ScalerSnapshot
  readonly epps: EppsSnapshot
  readonly next: number
}

function countOf(flags: Uint8Array): number {
  let count = 0
  for (const flag of flags) count += flag
  return count
}
