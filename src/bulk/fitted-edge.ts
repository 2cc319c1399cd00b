import type { Spectrum, SymmetricSolver } from '../spectrum/spectrum.ts'
import type { Bulk } from './bulk.ts'
import { BulkFitter, type BulkOptions } from './fit-bulk.ts'
import { poorFit } from './fit-limit.ts'
import { type FrameTable, ResampledEdge } from './resampled-edge.ts'

/** Frames in a row with a poor fit before the frames are resampled, and with a good one before they are not. */
const patience = 10
/** One draw a frame until there are so many, then one in so many frames. */
const drawsAtFirst = 30
const framesADraw = 64
const drawsKept = 100

/**
 * The bulk of one window after another. While the law describes it, its edge is the law's; where it has not
 * for a run of frames, the edge resampled from the window's own frames takes its place, and the bulk says so
 * by its model. Draws are spread over the frames; the first ones, with the common modes left in, only find out
 * which modes there are, and are then drawn anew without them.
 */
export class FittedEdge {
  readonly #fitter: BulkFitter
  readonly #resampled: ResampledEdge
  #poor = false
  /** Frames in a row that speak against the present choice. */
  #against = 0
  #frames = 0
  /** Escapes by the resampled edge: what is projected off before a draw. */
  #common = 0
  #settled = false

  constructor(options: BulkOptions, solver: SymmetricSolver, seed = 1) {
    this.#fitter = new BulkFitter(options)
    this.#resampled = new ResampledEdge(solver, {
      level: options.level,
      decay: options.decay,
      seed,
      drawsKept,
    })
  }

  /** `table` gives the frames of the window, of the signals of the spectrum; it is asked only for a draw. */
  fit(spectrum: Spectrum, effective: number, table: () => FrameTable): Bulk {
    const byLaw = this.#fitter.fit(spectrum, effective)
    this.#against = poorFit(byLaw, spectrum.n) === this.#poor ? 0 : this.#against + 1
    if (this.#against >= patience) {
      this.#poor = !this.#poor
      this.#against = 0
    }
    if (!this.#poor) return byLaw
    this.#frames++
    const { draws } = this.#resampled
    if (draws < drawsAtFirst || this.#frames % framesADraw === 0) {
      const count = Math.min(this.#common, spectrum.modes)
      this.#resampled.draw(table(), { count, vectors: spectrum.vectors })
    }
    const limit = this.#resampled.limit
    if (limit === null || limit.spectrum.length !== spectrum.n) return byLaw
    const bulk = this.#fitter.fit(spectrum, effective, limit)
    this.#common = bulk.escapes.length
    if (this.#settled || this.#common === 0) return bulk
    this.#settled = true
    this.#resampled.clear()
    return byLaw
  }

  /** The same fit of a spectrum with more vectors, without a further step in time. */
  again(spectrum: Spectrum, effective: number): Bulk {
    const limit = this.#poor ? this.#resampled.limit : null
    return this.#fitter.fit(spectrum, effective, limit?.spectrum.length === spectrum.n ? limit : null)
  }

  snapshot(): unknown {
    return {
      resampled: this.#resampled.snapshot(),
      poor: this.#poor,
      against: this.#against,
      frames: this.#frames,
      common: this.#common,
      settled: this.#settled,
    } satisfies FittedEdgeSnapshot
  }

  restore(snapshot: unknown): void {
    const s = snapshot as FittedEdgeSnapshot
    this.#resampled.restore(s.resampled)
    this.#poor = s.poor
    this.#against = s.against
    this.#frames = s.frames
    this.#common = s.common
    this.#settled = s.settled
  }
}

interface FittedEdgeSnapshot {
  readonly resampled: unknown
  readonly poor: boolean
  readonly against: number
  readonly frames: number
  readonly common: number
  readonly settled: boolean
}
