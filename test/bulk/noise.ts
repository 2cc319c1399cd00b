import { fastestSolver } from '../../src/spectrum/fastest-solver.ts'
import type { Random } from '../support/random.ts'

const solver = fastestSolver()

/** n × frames values, row i the signal i. */
export interface Signals {
  readonly n: number
  readonly frames: number
  readonly values: Float64Array
}

export function normalSignals(random: Random, n: number, frames: number): Signals {
  return { n, frames, values: Float64Array.from({ length: n * frames }, () => random.normal()) }
}

export interface Reading {
  /** Weights of the frames, summing to 1; left out: equal. */
  readonly weights?: Float64Array
  /** Known means and variances; else both are taken out, as a correlation does. */
  readonly known?: boolean
  readonly modes?: number
}

/** Spectrum of the covariance (`known`) or the correlation of signals; the signals are left unchanged. */
export function spectrumOf({ n, frames, values }: Signals, { weights, known, modes }: Reading = {}) {
  const x = values.slice()
  for (let i = 0; i < n; i++) {
    const row = x.subarray(i * frames, (i + 1) * frames)
    const weight = (t: number): number => weights?.[t] ?? 1 / frames
    const mean = known ? 0 : row.reduce((sum, v, t) => sum + weight(t) * v, 0)
    let squares = 0
    for (let t = 0; t < frames; t++) {
      row[t] = (row[t]! - mean) * Math.sqrt(weight(t))
      squares += row[t]! ** 2
    }
    if (!known) for (let t = 0; t < frames; t++) row[t] = row[t]! / Math.sqrt(squares)
  }
  const matrix = new Float64Array(n * n)
  for (let i = 0; i < n; i++) {
    for (let j = 0; j <= i; j++) {
      let inner = 0
      for (let t = 0; t < frames; t++) inner += x[i * frames + t]! * x[j * frames + t]!
      matrix[i * n + j] = inner
    }
  }
  return solver.solve(matrix, n, modes ?? 0)
}

/** Weights (1 − a)aᵏ of a memory with the given half-life, cut where they are below 1e-4 of the first. */
export function memoryWeights(halfLife: number): { weights: Float64Array; decay: number; effective: number } {
  const decay = 2 ** (-1 / halfLife)
  const weights = Float64Array.from({ length: Math.ceil(13.3 * halfLife) }, (_, k) => decay ** k)
  const total = weights.reduce((sum, w) => sum + w, 0)
  return { weights: weights.map((w) => w / total), decay, effective: (1 + decay) / (1 - decay) }
}

/** How far a count of `draws` may lie from its chance: four binomial standard deviations. */
export const fourDeviations = (chance: number, draws: number): number =>
  4 * Math.sqrt((chance * (1 - chance)) / draws)

export const meanOf = (values: readonly number[]): number =>
  values.reduce((sum, v) => sum + v, 0) / values.length
