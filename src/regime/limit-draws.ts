import type { SymmetricSolver } from '../spectrum/spectrum.ts'
import { blockLength, drawWith, drawWithout, randomFrom } from './block-draws.ts'
import { type Calibration, cubeRoot, type DistanceLimit } from './evidence.ts'
import { type Base, measure } from './measures.ts'
import { Random } from './random.ts'
import { matrixOf, type Rows, range, type Scale } from './rows.ts'
import { exponentialTail, upperNormal } from './tail.ts'

/** What a draw imitates. */
export type DrawPlan =
  /** A window of `span` frames against the fixed reference that the rows are. */
  | { readonly kind: 'fixed'; readonly span: number }
  /** The same where only the reference's matrix is known: normal frames with that matrix, `frames` its own number. */
  | { readonly kind: 'normal'; readonly span: number; readonly frames: number }
  /** Two windows of `span` frames, the later one `lag` frames after the other. */
  | { readonly kind: 'lagged'; readonly span: number; readonly lag: number }

/**
 * Learns how the statistics of a window scatter when nothing changes, a few draws at a time.
 *
 * *Fixed reference of T0 frames.* A window drawn without replacement from the reference deviates from it with
 * variance σ²(1/T − 1/T0); a new window, from a reference that is itself a sample, with σ²(1/T + 1/T0)
 * (sampling from a finite population: Cochran 1977). So the deviations of matrix and eigenvalues from their
 * means over the draws are stretched by √((T0+T)/(T0−T)); drawing without replacement keeps the spread of
 * the sample eigenvalues true, which repeated frames would not. With T0 < 1.5 T blocks are drawn with
 * replacement and stretched by √(1+T/T0).
 *
 * *Lagged reference.* Two windows as far apart as the real ones, from a longer stretch of frames; nothing
 * is stretched.
 */
export class LimitDraws {
  readonly wanted: number
  #plan: DrawPlan
  #rows: Rows
  #base: Base
  #scale: Scale
  #solver: SymmetricSolver
  #random: Random
  #drawn = 0
  #values: Float64Array
  #root: Float64Array
  #whole: Float64Array
  #partners: Float64Array
  #spectra: Float64Array

  /** `rows`: the reference's frames (plan `normal`: none needed); `base`: what they make. */
  constructor(
    plan: DrawPlan,
    rows: Rows,
    base: Base,
    scale: Scale,
    solver: SymmetricSolver,
    wanted: number,
    seed: number,
  ) {
    this.#plan = plan
    this.#rows = rows
    this.#base = base
    this.#scale = scale
    this.#solver = solver
    this.#random = new Random(seed)
    this.wanted = wanted
    this.#values = new Float64Array(plan.kind === 'lagged' ? 0 : wanted * base.n)
    this.#root = new Float64Array(wanted)
    this.#whole = new Float64Array(wanted)
    this.#partners = new Float64Array(wanted)
    this.#spectra = new Float64Array(wanted)
  }

  get done(): boolean {
    return this.#drawn >= this.wanted
  }

  /** Makes up to `count` further draws. */
  step(count: number): void {
    for (let k = 0; k < count && !this.done; k++) {
      const [matrix, base] = this.#draw()
      const values = this.#solver.solve(matrix, base.n, 0).values
      const m = measure(matrix, values, base)
      const at = this.#drawn++
      this.#root[at] = cubeRoot(m)
      this.#whole[at] = m.ceiling ** 2
      this.#partners[at] = m.partners ** 2
      this.#spectra[at] = m.w2 ** 2
      if (this.#plan.kind !== 'lagged') {
        for (let i = 0; i < base.n; i++) this.#values[at * base.n + i] = values[i]! - base.values[i]!
      }
    }
  }

  /** The limits that one window passes with probability `p`; see windowTail. */
  calibration(p: number): Calibration {
    const square = this.#stretch() ** 2
    if (this.#plan.kind !== 'lagged') this.#stretchSpectra(Math.sqrt(square))
    return {
      n: this.#base.n,
      share: this.#shareLimit(p, Math.sqrt(square)),
      distances: {
        'spectral-distance': limitOf(this.#spectra, p),
        frobenius: limitOf(
          this.#whole.map((v) => v * square),
          p,
        ),
        'partner-distance': limitOf(
          this.#partners.map((v) => v * square),
          p,
        ),
      },
    }
  }

  snapshot(): DrawsSnapshot {
    return {
      random: this.#random.state.slice(),
      drawn: this.#drawn,
      values: this.#values.slice(),
      root: this.#root.slice(),
      whole: this.#whole.slice(),
      partners: this.#partners.slice(),
      spectra: this.#spectra.slice(),
    }
  }

  restore(s: DrawsSnapshot): void {
    this.#random = randomFrom(s.random)
    this.#drawn = s.drawn
    this.#values.set(s.values)
    this.#root.set(s.root)
    this.#whole.set(s.whole)
    this.#partners.set(s.partners)
    this.#spectra.set(s.spectra)
  }

  #draw(): [Float64Array, Base] {
    const plan = this.#plan
    const rows = this.#rows
    if (plan.kind === 'normal') {
      const frames = normalRows(this.#base, plan.span, this.#random)
      return [matrixOf(frames, range(plan.span), this.#scale), this.#base]
    }
    const block = blockLength(rows.count, plan.span)
    if (plan.kind === 'fixed') {
      const draw = rows.count >= 1.5 * plan.span ? drawWithout : drawWith
      return [matrixOf(rows, draw(this.#random, rows.count, plan.span, block), this.#scale), this.#base]
    }
    const both = drawWithout(this.#random, rows.count, plan.span + Math.min(plan.lag, plan.span), block)
    const matrix = matrixOf(rows, both.subarray(both.length - plan.span), this.#scale)
    const before = matrixOf(rows, both.subarray(0, plan.span), this.#scale)
    const solved = this.#solver.solve(before, rows.n, 1)
    return [
      matrix,
      { n: rows.n, matrix: before, values: solved.values.slice(), leading: solved.vectors.slice(0, rows.n) },
    ]
  }

  #stretch(): number {
    const plan = this.#plan
    if (plan.kind === 'lagged') return 1
    const frames = plan.kind === 'normal' ? plan.frames : this.#rows.count
    return plan.kind === 'fixed' && frames >= 1.5 * plan.span
      ? Math.sqrt((frames + plan.span) / (frames - plan.span))
      : Math.sqrt(1 + plan.span / frames)
  }

  /** Squared W2 of each draw with the eigenvalues' deviations from their means stretched. */
  #stretchSpectra(stretch: number): void {
    const n = this.#base.n
    const means = new Float64Array(n)
    for (let b = 0; b < this.wanted; b++) {
      for (let i = 0; i < n; i++) means[i]! += this.#values[b * n + i]! / this.wanted
    }
    for (let b = 0; b < this.wanted; b++) {
      let sum = 0
      for (let i = 0; i < n; i++) {
        sum += (means[i]! + stretch * (this.#values[b * n + i]! - means[i]!)) ** 2
      }
      this.#spectra[b] = sum / n
    }
  }

  /** Normal on the scale of the cube root; two-sided, never inside the widest draw. */
  #shareLimit(p: number, stretch: number): Calibration['share'] {
    let centre = 0
    for (const y of this.#root) centre += y / this.wanted
    let square = 0
    let widest = 0
    for (const y of this.#root) {
      square += (y - centre) ** 2 / (this.wanted - 1)
      widest = Math.max(widest, Math.abs(y - centre))
    }
    return { centre, reach: stretch * Math.max(widest, upperNormal(p / 2) * Math.sqrt(square)) }
  }
}

function limitOf(squares: Float64Array, p: number): DistanceLimit {
  const sorted = squares.slice().sort()
  return {
    rest: Math.sqrt(sorted[Math.floor(sorted.length / 2)]!),
    limit: Math.sqrt(exponentialTail(squares, p)),
    meanSquare: squares.reduce((s, v) => s + v / squares.length, 0),
  }
}

/** Normal frames with the base's matrix, by its Cholesky factor; a matrix without full rank is mended. */
function normalRows(base: Base, count: number, random: Random): Rows {
  const n = base.n
  const factor = new Float64Array(n * n)
  for (let i = 0; i < n; i++) {
    for (let j = 0; j <= i; j++) {
      let sum = base.matrix[i * n + j]!
      for (let k = 0; k < j; k++) sum -= factor[i * n + k]! * factor[j * n + k]!
      if (i === j) factor[i * n + i] = Math.sqrt(Math.max(sum, 1e-8))
      else factor[i * n + j] = sum / factor[j * n + j]!
    }
  }
  const values = new Float64Array(count * n)
  const z = new Float64Array(n)
  for (let row = 0; row < count; row++) {
    for (let i = 0; i < n; i++) z[i] = random.normal()
    for (let i = 0; i < n; i++) {
      let sum = 0
      for (let k = 0; k <= i; k++) sum += factor[i * n + k]! * z[k]!
      values[row * n + i] = sum
    }
  }
  return { n, count, values, present: new Uint8Array(count * n).fill(1) }
}

export interface DrawsSnapshot {
  readonly random: Uint32Array
  readonly drawn: number
  readonly values: Float64Array
  readonly root: Float64Array
  readonly whole: Float64Array
  readonly partners: Float64Array
  readonly spectra: Float64Array
}
