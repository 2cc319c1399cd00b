import type { Spectrum } from '../spectrum/spectrum.ts'
import type { Bulk, BulkModel, Escape } from './bulk.ts'
import { exponentialEdges, exponentialLaw } from './exponential-memory.ts'
import { noiseLimit } from './johnstone.ts'
import { kolmogorovSmirnov, LawTable } from './law-table.ts'
import { type Edges, marchenkoPasturEdges, marchenkoPasturLaw } from './marchenko-pastur.ts'

export interface BulkOptions {
  /** Chance that the largest noise eigenvalue counts as an escape. */
  readonly level: number
  /** a of an exponential memory; null for a boxcar. */
  readonly decay: number | null
}

/** A limit from resampled frames, in units of the noise variance, that takes the place of the law's. */
export interface ResampledLimit {
  readonly upper: number
  readonly limit: number
}

/** Beyond this Kolmogorov–Smirnov distance the law does not describe the bulk. */
export const fitWanted = 0.2

/**
 * Fits the noise bulk by sequential deflation (Kritchman & Nadler 2009): as long as the largest eigenvalue
 * left exceeds the Tracy–Widom limit for the p eigenvalues left, noise variance their mean, it is an escape.
 * At most half of the spectrum may escape.
 */
export class BulkFitter {
  readonly #options: BulkOptions
  #tables = new Map<string, LawTable>()

  constructor(options: BulkOptions) {
    this.#options = options
  }

  /**
   * `effective`: number of independent frames that the window is worth. The spectrum should hold the vectors
   * of what escapes; the participation of an escape whose vector it lacks is given as n.
   */
  fit(spectrum: Spectrum, effective: number, resampled: ResampledLimit | null = null): Bulk {
    const { values, n } = spectrum
    let rest = 0
    for (const value of values) rest += value
    let escaped = 0
    let noise = this.#noise(n, effective, resampled)
    let variance = rest / n
    while (escaped < n >> 1 && values[escaped]! > variance * noise.limit) {
      rest = Math.max(0, rest - values[escaped]!)
      escaped++
      noise = this.#noise(n - escaped, effective, resampled)
      variance = rest / (n - escaped)
    }
    const q = (n - escaped) / effective
    const law = this.#model
    const bulk = values.subarray(escaped)
    return {
      model: resampled === null ? law : 'resampled',
      lower: variance * noise.edges.lower,
      upper: variance * noise.edges.upper,
      level: this.#options.level,
      limit: variance * noise.limit,
      fit: kolmogorovSmirnov(bulk, this.#table(q), variance),
      variance,
      q,
      escapes: Array.from({ length: escaped }, (_, k) => escapeOf(spectrum, k)),
    }
  }

  get #model(): Exclude<BulkModel, 'resampled'> {
    return this.#options.decay === null ? 'marchenko-pastur' : 'exponential'
  }

  /**
   * Edges and limit for p noise eigenvalues of variance 1. For the exponential memory N(1 − a) is written as
   * N(1 + a)/T_eff, T_eff Kish's (1 + a)/(1 − a), so that what shortens T_eff widens the bulk.
   */
  #noise(p: number, effective: number, resampled: ResampledLimit | null): { edges: Edges; limit: number } {
    const { level, decay } = this.#options
    const edges =
      decay === null ? marchenkoPasturEdges(p / effective) : exponentialEdges((p * (1 + decay)) / effective)
    if (resampled !== null) return { edges: { ...edges, upper: resampled.upper }, limit: resampled.limit }
    return { edges, limit: noiseLimit(decay === null ? effective : framesOfEdge(p, edges.upper), p, level) }
  }

  #table(q: number): LawTable {
    const key = q.toPrecision(4)
    const known = this.#tables.get(key)
    if (known !== undefined) return known
    if (this.#tables.size >= 64) this.#tables.clear()
    const { decay } = this.#options
    const table = new LawTable(decay === null ? marchenkoPasturLaw(q) : exponentialLaw(q * (1 + decay)))
    this.#tables.set(key, table)
    return table
  }
}

/** Frames of a boxcar whose upper edge lies where this one does: it lends the edge its fluctuation. */
const framesOfEdge = (p: number, upper: number): number => p / (Math.sqrt(upper) - 1) ** 2

function escapeOf(spectrum: Spectrum, k: number): Escape {
  const { n, modes, vectors, values } = spectrum
  if (k >= modes) return { value: values[k]!, signals: n }
  let fourth = 0
  for (let i = k * n; i < (k + 1) * n; i++) fourth += vectors[i]! ** 4
  return { value: values[k]!, signals: 1 / fourth }
}
