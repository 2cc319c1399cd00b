import type { SymmetricSolver } from '../spectrum/spectrum.ts'
import type { ResampledLimit } from './fit-bulk.ts'

/** The frames of a window: row t holds the n values of frame t, missing ones 0. */
export interface FrameRows {
  readonly n: number
  readonly frames: number
  value(t: number, i: number): number
}

const drawsWanted = 40
const drawsKept = 200

/**
 * The largest eigenvalue after each signal was shifted round by a random offset of its own: memory, tails and
 * gaps stay, what signals share is lost (circular shifts after Politis & Romano 1994). One draw a call; the
 * limit is the quantile of the kept draws at the level.
 */
export class ResampledEdge {
  readonly #solver: SymmetricSolver
  readonly #level: number
  #draws: number[] = []
  #state: number

  constructor(solver: SymmetricSolver, level: number, seed: number) {
    this.#solver = solver
    this.#level = level
    this.#state = seed >>> 0
  }

  /** Takes one draw from the present window; gives the limit, or null while there are too few draws. */
  draw(rows: FrameRows): ResampledLimit | null {
    const { n, frames } = rows
    const columns = new Float64Array(n * frames)
    for (let i = 0; i < n; i++) {
      const shift = this.#below(frames)
      let sum = 0
      for (let t = 0; t < frames; t++) sum += rows.value(t, i)
      let square = 0
      for (let t = 0; t < frames; t++) square += (rows.value(t, i) - sum / frames) ** 2
      const scale = square > 0 ? 1 / Math.sqrt(square) : 0
      for (let t = 0; t < frames; t++) {
        columns[i * frames + ((t + shift) % frames)] = (rows.value(t, i) - sum / frames) * scale
      }
    }
    const matrix = new Float64Array(n * n)
    for (let i = 0; i < n; i++) {
      for (let j = 0; j <= i; j++) {
        let inner = 0
        for (let t = 0; t < frames; t++) inner += columns[i * frames + t]! * columns[j * frames + t]!
        matrix[i * n + j] = inner
      }
    }
    this.#draws.push(this.#solver.solve(matrix, n, 0).values[0]!)
    if (this.#draws.length > drawsKept) this.#draws.shift()
    return this.limit
  }

  get limit(): ResampledLimit | null {
    const n = this.#draws.length
    if (n < drawsWanted) return null
    const sorted = [...this.#draws].sort((a, b) => a - b)
    return { upper: sorted[n >> 1]!, limit: sorted[Math.min(n - 1, Math.ceil((1 - this.#level) * n))]! }
  }

  /** mulberry32, from memory. */
  #below(limit: number): number {
    this.#state = (this.#state + 0x6d2b79f5) >>> 0
    let t = this.#state
    t = Math.imul(t ^ (t >>> 15), t | 1)
    t ^= t + Math.imul(t ^ (t >>> 7), t | 61)
    return Math.floor((((t ^ (t >>> 14)) >>> 0) / 2 ** 32) * limit)
  }

  snapshot(): ResampledEdgeSnapshot {
    return { draws: [...this.#draws], state: this.#state }
  }

  restore({ draws, state }: ResampledEdgeSnapshot): void {
    this.#draws = [...draws]
    this.#state = state
  }
}

export interface ResampledEdgeSnapshot {
  readonly draws: readonly number[]
  readonly state: number
}
