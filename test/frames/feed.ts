import type { Frame } from '../../src/frames/frame.ts'
import { FrameMaker, type FrameOptions, type Made } from '../../src/frames/frame-maker.ts'
import type { DropCounts } from '../../src/reasons.ts'
import { addDrops } from '../../src/reasons.ts'

export type Reading = readonly [signal: string, time: number, value: number]

export const plainOptions: FrameOptions = {
  signals: { pattern: '*', limit: 100 },
  step: 1000,
  lateness: 500,
  staleAfter: null,
  idleAfter: 30_000,
  ahead: 86_400_000,
  sessions: null,
  increment: 'difference',
  levelSpan: 100,
  memory: 'none',
  fitOver: 100,
  commonVolatility: 'keep',
  truncateAt: null,
  scaleSpan: 100,
  scaleFixedAfter: null,
  stuckAfter: null,
}

/** Later than every time in these tests. */
export const present = Date.UTC(2100, 0)

/** Feeds readings and gathers what comes of them. */
export class Feeder {
  readonly maker: FrameMaker
  readonly frames: Frame[] = []
  readonly findings: Made['findings'][number][] = []
  dropped: DropCounts = {}
  readonly #names: string[] = []

  constructor(options: Partial<FrameOptions> = {}, maker?: FrameMaker) {
    this.maker = maker ?? new FrameMaker({ ...plainOptions, ...options })
  }

  take(readings: readonly Reading[], source = 'a', now = present): this {
    const signal = new Int32Array(readings.length)
    for (const [k, [name]] of readings.entries()) {
      const id = this.#names.indexOf(name)
      signal[k] = id >= 0 ? id : this.#names.push(name) - 1
    }
    const time = Float64Array.from(readings, (reading) => reading[1])
    const value = Float64Array.from(readings, (reading) => reading[2])
    return this.note(
      this.maker.take(source, { count: readings.length, names: this.#names, signal, time, value }, now),
    )
  }

  /** All sources end: what waits is closed. */
  end(...sources: readonly string[]): this {
    for (const source of sources.length > 0 ? sources : ['a']) this.note(this.maker.ended(source, present))
    return this
  }

  note({ frames, findings, dropped }: Made): this {
    this.frames.push(...frames)
    this.findings.push(...findings)
    this.dropped = addDrops(this.dropped, dropped)
    return this
  }

  /** Name → increment of each frame, missing signals left out. */
  get table(): { time: number; increments: Record<string, number> }[] {
    return this.frames.map(({ time, present, increments }) => ({
      time,
      increments: Object.fromEntries(
        [...present].flatMap((here, i) => (here === 1 ? [[this.maker.names[i]!, increments[i]!]] : [])),
      ),
    }))
  }
}
