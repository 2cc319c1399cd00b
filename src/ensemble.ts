import type { Bulk } from './bulk/bulk.ts'
import type { FittedEdge } from './bulk/fitted-edge.ts'
import type { FrameTable } from './bulk/resampled-edge.ts'
import type { FeedEvent } from './feeds/feed.ts'
import type { Frame } from './frames/frame.ts'
import type { FrameMaker, Made } from './frames/frame-maker.ts'
import type { SignalCondition } from './frames/hygiene.ts'
import type { Observation, RegimeWatch, Verdict } from './regime/regime.ts'
import { leadingShare } from './spectrum/shares.ts'
import type { SymmetricSolver } from './spectrum/spectrum.ts'
import { SpectrumRing } from './spectrum/spectrum-ring.ts'
import { FrameRing, type RingSnapshot } from './window/frame-ring.ts'
import type { LaggedWindow } from './window/lagged-window.ts'
import type { TwinWindow } from './window/twin-window.ts'

/** The steps of a frame's way, as the metrics and the bench name them. */
export const steps = ['frames', 'window', 'spectrum', 'bulk', 'regime'] as const
export type Step = (typeof steps)[number]

/** One frame with all that was found out about it: plain values, nothing borrowed. */
export interface Judged {
  readonly ensemble: string
  readonly frame: number
  /** End of the frame, milliseconds since 1970 UTC. */
  readonly time: number
  /** Signals that take part in the matrix. */
  readonly signals: number
  readonly missing: number
  readonly clipped: number
  readonly volatility: number
  readonly window: { readonly frames: number; readonly effective: number }
  /** Signals of the roster left out of the matrix, with the reason. */
  readonly absent: readonly { readonly signal: string; readonly why: string }[]
  /** λ1 over the trace. */
  readonly share: number | null
  /** Largest eigenvalues, at most eight. */
  readonly leading: readonly number[]
  readonly bulk: Bulk | null
  readonly certificate: number | null
  readonly spectrum: { readonly age: number; readonly bound: number } | null
  readonly verdict: Verdict
  /** Milliseconds spent on each step of this frame. */
  readonly spent: Readonly<Record<Exclude<Step, 'frames'>, number>>
}

export interface EnsembleParts {
  readonly name: string
  readonly title: string
  /** Feeds it draws from; null: all. */
  readonly feeds: ReadonlySet<string> | null
  readonly maker: FrameMaker
  readonly window: TwinWindow
  /** The window of `reference: { lagged }`; null for every other kind of reference. */
  readonly lagged: LaggedWindow | null
  readonly solver: SymmetricSolver
  readonly watch: RegimeWatch
  readonly bulk: FittedEdge
  readonly scale: 'correlation' | 'covariance'
}

const mostLeading = 8
/** Steps that a source may run ahead of the slowest one before it is held. */
const mostLead = 2000

/**
 * One ensemble's way from readings to verdicts, composed of the rooms and as deterministic as they are: no
 * clock, no stream. `take` and `beat` close frames; `judge` carries one frame through to its verdict.
 */
export class Ensemble {
  readonly name: string
  readonly title: string
  #parts: EnsembleParts
  #matrix = new Float64Array(0)
  #laggedMatrix = new Float64Array(0)
  /** The frames of the window (exponential memory: of its span), for resampling. */
  #frames: FrameRing
  /** Spectra of the last windows, as many as the lag; null without one. */
  #spectra: SpectrumRing | null
  /** Leading modes asked of the solver: one more than escaped in the frame before. */
  #modes = 2
  /** Fixed scales of covariance, by roster index; null until the window was first full. */
  #scales: Float64Array | null = null

  constructor(parts: EnsembleParts) {
    this.name = parts.name
    this.title = parts.title
    this.#parts = parts
    this.#frames = new FrameRing(parts.window.cleaned.span)
    this.#spectra = parts.lagged === null ? null : new SpectrumRing(parts.lagged.lag)
  }

  drawsFrom(feed: string): boolean {
    return this.#parts.feeds === null || this.#parts.feeds.has(feed)
  }

  /** Takes what a feed says; gives the frames that it closes. `now` is the present, milliseconds since 1970. */
  take(feed: string, event: FeedEvent, now: number): Made {
    const { maker } = this.#parts
    const named = (source: string): string => `${feed}/${source}`
    switch (event.type) {
      case 'batch':
        return maker.take(named(event.source), event.batch, now)
      case 'assigned':
        return maker.assign(event.sources.map(named), now)
      case 'revoked':
        return maker.revoke(event.sources.map(named), now)
      case 'caught-up':
        return maker.caughtUp(named(event.source), now)
      case 'ended':
        return maker.ended(named(event.source), now)
      default:
        return maker.beat(now)
    }
  }

  /** Time passes without a reading: sources may fall idle. */
  beat(now: number): Made {
    return this.#parts.maker.beat(now)
  }

  watches(signal: string): boolean {
    return this.#parts.maker.watches(signal)
  }

  /** Sources of a feed, each with whether it runs too far ahead of the slowest one. */
  *leads(feed: string, now: number): Generator<readonly [source: string, tooFar: boolean]> {
    const prefix = `${feed}/`
    for (const [source, steps] of this.#parts.maker.leads(now)) {
      if (source.startsWith(prefix)) yield [source.slice(prefix.length), steps > mostLead]
    }
  }

  /** Lets go of sources whose feed is not among these: after a restart with other settings. */
  keepFeeds(feeds: ReadonlySet<string>, now: number): void {
    const { maker } = this.#parts
    const gone = [...maker.leads(now)]
      .map(([source]) => source)
      .filter((source) => !feeds.has(source.split('/')[0]!))
    if (gone.length > 0) maker.revoke(gone, now)
  }

  /** How many signals are well, and how many have which finding; each counts once. */
  get conditions(): Readonly<Record<SignalCondition, number>> {
    return this.#parts.maker.conditions
  }

  /** A warning about the clock's step, or null. */
  get stepWarning(): string | null {
    return this.#parts.maker.stepWarning
  }

  /** Carries a frame through window, spectrum, bulk and regime. `lap` reads a clock for the time spent. */
  judge(frame: Frame, lap: () => number): Judged {
    const { window, lagged, solver, watch, maker } = this.#parts
    const started = lap()
    window.push(frame.scaled, frame.cleaned, frame.present, frame.clipped)
    lagged?.push(frame.cleaned, frame.present)
    this.#frames.push(frame.cleaned, frame.present)
    const active = window.cleaned.active()
    const matrix = window.cleaned.full && active.length >= 2 ? this.#present(active) : null
    const certificate = matrix === null ? null : window.certificate(matrix, active, this.#scales ?? undefined)
    const windowed = lap()
    let spectrum = matrix === null ? null : solver.solve(matrix, active.length, this.#modes)
    const solved = lap()
    const effective = window.cleaned.effective * maker.effectiveShare
    let bulk = spectrum === null ? null : this.#parts.bulk.fit(spectrum, effective, () => this.#table(active))
    if (matrix !== null && bulk !== null && bulk.escapes.length > this.#modes) {
      spectrum = solver.solve(matrix, active.length, bulk.escapes.length)
      bulk = this.#parts.bulk.again(spectrum, effective)
    }
    if (bulk !== null) this.#modes = Math.max(2, bulk.escapes.length + 1)
    const reference = lagged === null ? null : this.#laggedReference(active)
    this.#spectra?.push(active, spectrum)
    const fitted = lap()
    const span = { frames: window.cleaned.frames, effective }
    const verdict = watch.push({
      frame: frame.index,
      time: frame.time,
      names: maker.names,
      cleaned: frame.cleaned,
      present: frame.present,
      active,
      matrix,
      spectrum,
      bulk,
      window: span,
      certificate,
      ...(lagged === null ? {} : { reference }),
    })
    const judged = lap()
    return {
      ensemble: this.name,
      frame: frame.index,
      time: frame.time,
      signals: active.length,
      missing: frame.missing,
      clipped: frame.clipped,
      volatility: frame.volatility,
      window: span,
      absent: window.cleaned.absent().map(({ index, why }) => ({ signal: maker.names[index] ?? '', why })),
      share: spectrum === null ? null : leadingShare(spectrum.values),
      leading: spectrum === null ? [] : [...spectrum.values.subarray(0, mostLeading)],
      bulk,
      certificate,
      spectrum: spectrum === null ? null : { age: spectrum.age, bound: spectrum.bound },
      verdict,
      spent: {
        window: windowed - started,
        spectrum: solved - windowed,
        bulk: fitted - solved,
        regime: judged - fitted,
      },
    }
  }

  #present(active: Int32Array): Float64Array {
    const window = this.#parts.window.cleaned
    const entries = active.length ** 2
    if (this.#matrix.length !== entries) this.#matrix = new Float64Array(entries)
    if (this.#parts.scale === 'covariance') window.covariance(this.#matrix, active, this.#fixedScales())
    else window.correlation(this.#matrix, active)
    return this.#matrix
  }

  #table(active: Int32Array): FrameTable {
    const n = active.length
    const frames = this.#frames.length
    const values = new Float64Array(n * frames)
    for (let t = 0; t < frames; t++) {
      const frame = this.#frames.values(frames - 1 - t)
      for (let a = 0; a < n; a++) values[t * n + a] = frame[active[a]!] ?? 0
    }
    return { n, frames, values }
  }

  #laggedReference(active: Int32Array): NonNullable<Observation['reference']> | null {
    const { lagged, solver, scale } = this.#parts
    if (lagged === null || !lagged.full) return null
    const entries = active.length ** 2
    if (this.#laggedMatrix.length !== entries) this.#laggedMatrix = new Float64Array(entries)
    if (scale === 'covariance') lagged.covariance(this.#laggedMatrix, active, this.#fixedScales())
    else lagged.correlation(this.#laggedMatrix, active)
    const spectrum = this.#spectra?.oldest(active) ?? solver.solve(this.#laggedMatrix, active.length, 1)
    return { matrix: this.#laggedMatrix, spectrum, signals: lagged.active() }
  }

  /** In covariance: the deviations of the window when it was first full; later signals get their own. */
  #fixedScales(): Float64Array {
    const window = this.#parts.window.cleaned
    const n = this.#parts.maker.names.length
    if (this.#scales === null || this.#scales.length < n) {
      const scales = new Float64Array(n)
      for (let i = 0; i < n; i++) scales[i] = this.#scales?.[i] || window.deviation(i)
      this.#scales = scales
    }
    return this.#scales
  }

  snapshot(): unknown {
    const { maker, window, lagged, watch } = this.#parts
    return {
      names: [...maker.names],
      maker: maker.snapshot(),
      window: window.snapshot(),
      lagged: lagged?.snapshot() ?? null,
      frames: this.#frames.snapshot(),
      bulk: this.#parts.bulk.snapshot(),
      spectra: this.#spectra?.snapshot() ?? null,
      watch: watch.snapshot(),
      modes: this.#modes,
      scales: this.#scales?.slice() ?? null,
    } satisfies EnsembleSnapshot
  }

  restore(snapshot: unknown): void {
    const { maker, window, lagged, watch } = this.#parts
    const s = snapshot as EnsembleSnapshot
    maker.restore(s.maker)
    window.restore(s.window)
    lagged?.restore(s.lagged)
    this.#frames.restore(s.frames)
    this.#parts.bulk.restore(s.bulk)
    this.#spectra?.restore(s.spectra)
    watch.restore(s.watch)
    this.#modes = s.modes
    this.#scales = s.scales
  }
}

export interface EnsembleSnapshot {
  readonly names: readonly string[]
  readonly maker: unknown
  readonly window: unknown
  readonly lagged: unknown
  readonly frames: RingSnapshot
  readonly bulk: unknown
  readonly spectra: unknown
  readonly watch: unknown
  readonly modes: number
  readonly scales: Float64Array | null
}
