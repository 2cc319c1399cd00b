import type { SymmetricSolver } from '../spectrum/spectrum.ts'
import { tracyWidomUpper } from './tracy-widom.ts'

/** The frames of a window, oldest first: `frames` rows of n values, row-major, missing ones 0. */
export interface FrameTable {
  readonly n: number
  readonly frames: number
  readonly values: Float64Array
}

/** What the window's signals do by chance, from resampling; in units of the noise variance. */
export interface ResampledLimit {
  /** Medians of the smallest and of the largest eigenvalue. */
  readonly lower: number
  readonly upper: number
  /** What the largest eigenvalue exceeds with probability `level`. */
  readonly limit: number
  /** Mean of the k-th largest eigenvalue, k = 1 … n. */
  readonly spectrum: Float64Array
}

export interface ResampledEdgeOptions {
  readonly level: number
  readonly seed: number
  /** a of an exponential memory; null for a boxcar. */
  readonly decay: number | null
  /** How many draws count, the last ones; default 400. */
  readonly drawsKept?: number
}

/** The first `count` rows of `vectors`, orthonormal, n entries each. */
export interface CommonModes {
  readonly count: number
  readonly vectors: Float64Array
}

const none: CommonModes = { count: 0, vectors: new Float64Array(0) }
/** A variance below this part of the squared mean is rounding of a constant signal. */
const rounding = 1e-20
const fewestDraws = 20
const usualDrawsKept = 400
/** Mean and standard deviation of the Tracy–Widom law, β = 1 (Bornemann 2010). */
const lawMean = -1.206533574582
const lawDeviation = Math.sqrt(1.607781034581)

/**
 * The edge of the bulk from the data: each signal is shifted round by a random offset of its own, which keeps
 * its memory and its tails and loses what it shares with the others (circular shifts after Politis & Romano
 * 1994). One draw a call, so that a stream can spread them over its frames; the last ones count. A change of n
 * starts afresh.
 */
export class ResampledEdge {
  readonly #solver: SymmetricSolver
  readonly #options: ResampledEdgeOptions
  #spectra: Float64Array[] = []
  #next = 0
  #state: number
  /** The limit by the present draws, once it was asked for. */
  #limit: ResampledLimit | null = null
  #columns = new Float64Array(0)
  #scratch = new Float64Array(0)
  #matrix = new Float64Array(0)

  /** @throws RangeError when the level is not between 0 and 1 */
  constructor(solver: SymmetricSolver, options: ResampledEdgeOptions) {
    tracyWidomUpper(options.level)
    this.#solver = solver
    this.#options = options
    this.#state = options.seed >>> 0
  }

  /**
   * Takes one draw from the frames of the present window, at least two of them. `common` modes are projected
   * off every frame before: a strong one left in every signal would meet itself again, shifted, and raise the
   * limit well above that of noise. Give what escapes by this edge, not by the law, whose false escapes would
   * take the memory away that is to be measured.
   */
  draw(table: FrameTable, common: CommonModes = none): void {
    const { n, frames } = table
    if (this.#spectra.length > 0 && this.#spectra[0]!.length !== n) this.clear()
    this.#load(table)
    this.#standardise(n, frames, false)
    this.#projectOff(n, frames, common.count, common.vectors)
    this.#standardise(n, frames, true)
    this.#correlate(n, frames)
    this.#limit = null
    this.#spectra[this.#next] = this.#solver.solve(this.#matrix, n, 0).values
    this.#next = (this.#next + 1) % (this.#options.drawsKept ?? usualDrawsKept)
  }

  /** Forgets all draws. */
  clear(): void {
    this.#limit = null
    this.#spectra = []
    this.#next = 0
  }

  get draws(): number {
    return this.#spectra.length
  }

  /**
   * The limit by the draws so far; null below 20. While (draws + 1)·level is at least 1, the order statistic
   * that a further draw exceeds with probability at most `level`; for rarer levels the Tracy–Widom quantile
   * with the mean and the deviation of the draws, and no less than the largest.
   */
  get limit(): ResampledLimit | null {
    this.#limit ??= this.#limitOfDraws()
    return this.#limit
  }

  #limitOfDraws(): ResampledLimit | null {
    const draws = this.#spectra.length
    if (draws < fewestDraws) return null
    const n = this.#spectra[0]!.length
    const spectrum = new Float64Array(n)
    for (const values of this.#spectra) {
      for (let k = 0; k < n; k++) spectrum[k] = spectrum[k]! + values[k]! / draws
    }
    const largest = Float64Array.from(this.#spectra, (values) => values[0]!).sort()
    const smallest = Float64Array.from(this.#spectra, (values) => values[n - 1]!).sort()
    return {
      lower: Math.max(0, smallest[draws >> 1]!),
      upper: largest[draws >> 1]!,
      limit: limitOf(largest, this.#options.level),
      spectrum,
    }
  }

  #load({ n, frames, values }: FrameTable): void {
    if (this.#columns.length < n * frames) this.#columns = new Float64Array(n * frames)
    for (let t = 0; t < frames; t++) {
      for (let i = 0; i < n; i++) this.#columns[i * frames + t] = values[t * n + i]!
    }
  }

  /** Brings every signal to weighted mean 0 and variance 1; with `shifted` also turns it round and weights it. */
  #standardise(n: number, frames: number, shifted: boolean): void {
    const decay = this.#options.decay ?? 1
    if (this.#scratch.length < frames) this.#scratch = new Float64Array(frames)
    const turned = this.#scratch
    for (let i = 0; i < n; i++) {
      const shift = shifted ? this.#below(frames) : 0
      const start = i * frames
      let weight = 1
      let total = 0
      let sum = 0
      let squares = 0
      for (let t = frames - 1; t >= 0; t--) {
        const x = this.#columns[start + ((t + shift) % frames)]!
        turned[t] = x
        total += weight
        sum += weight * x
        weight *= decay
      }
      const mean = sum / total
      weight = 1
      for (let t = frames - 1; t >= 0; t--) {
        squares += weight * (turned[t]! - mean) ** 2
        weight *= decay
      }
      const varies = squares > rounding * total * mean * mean
      weight = varies ? 1 / Math.sqrt(shifted ? squares : squares / total) : 0
      const root = shifted ? Math.sqrt(decay) : 1
      for (let t = frames - 1; t >= 0; t--) {
        this.#columns[start + t] = (turned[t]! - mean) * weight
        weight *= root
      }
    }
  }

  #projectOff(n: number, frames: number, count: number, vectors: Float64Array): void {
    for (let k = 0; k < count; k++) {
      for (let t = 0; t < frames; t++) {
        let inner = 0
        for (let i = 0; i < n; i++) inner += vectors[k * n + i]! * this.#columns[i * frames + t]!
        for (let i = 0; i < n; i++) {
          const at = i * frames + t
          this.#columns[at] = this.#columns[at]! - inner * vectors[k * n + i]!
        }
      }
    }
  }

  #correlate(n: number, frames: number): void {
    if (this.#matrix.length !== n * n) this.#matrix = new Float64Array(n * n)
    const columns = this.#columns
    const matrix = this.#matrix
    for (let i = 0; i < n; i += 2) {
      for (let j = 0; j <= i; j += 2) {
        const lastRow = i + 1 < n
        const lastColumn = j + 1 < n
        const a = i * frames
        const b = lastRow ? a + frames : a
        const c = j * frames
        const d = lastColumn ? c + frames : c
        let ac = 0
        let ad = 0
        let bc = 0
        let bd = 0
        for (let t = 0; t < frames; t++) {
          const x = columns[a + t]!
          const y = columns[b + t]!
          const u = columns[c + t]!
          const v = columns[d + t]!
          ac += x * u
          ad += x * v
          bc += y * u
          bd += y * v
        }
        matrix[i * n + j] = ac
        if (lastColumn) matrix[i * n + j + 1] = ad
        if (lastRow) matrix[(i + 1) * n + j] = bc
        if (lastRow && lastColumn) matrix[(i + 1) * n + j + 1] = bd
      }
    }
    for (let i = 0; i < n; i++) matrix[i * n + i] = 1
  }

  /** A whole number below `limit`: mulberry32 (Tommy Ettinger, public domain; from memory). */
  #below(limit: number): number {
    this.#state = (this.#state + 0x6d2b79f5) >>> 0
    let t = this.#state
    t = Math.imul(t ^ (t >>> 15), t | 1)
    t ^= t + Math.imul(t ^ (t >>> 7), t | 61)
    return Math.floor((((t ^ (t >>> 14)) >>> 0) / 2 ** 32) * limit)
  }

  snapshot(): ResampledEdgeSnapshot {
    return { spectra: this.#spectra.map((values) => values.slice()), next: this.#next, state: this.#state }
  }

  restore(snapshot: unknown): void {
    const { spectra, next, state } = snapshot as ResampledEdgeSnapshot
    this.#limit = null
    this.#spectra = spectra.map((values) => values.slice())
    this.#next = next
    this.#state = state
  }
}

interface ResampledEdgeSnapshot {
  readonly spectra: readonly Float64Array[]
  readonly next: number
  readonly state: number
}

function limitOf(ascending: Float64Array, level: number): number {
  const draws = ascending.length
  const rank = Math.ceil((draws + 1) * (1 - level))
  if (rank <= draws) return ascending[rank - 1]!
  let mean = 0
  for (const x of ascending) mean += x / draws
  let square = 0
  for (const x of ascending) square += (x - mean) ** 2 / (draws - 1)
  const extended = mean + (Math.sqrt(square) * (tracyWidomUpper(level) - lawMean)) / lawDeviation
  return Math.max(extended, ascending[draws - 1]!)
}
