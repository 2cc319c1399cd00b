import { MomentEstimator, type MomentSnapshot } from './moment-estimator.ts'
import { type Absence, absentOf, activeOf, largestChange, type Window } from './window.ts'

/** Decay a of a memory whose weights halve in `halfLife` frames. */
export const decayOf = (halfLife: number): number => 2 ** (-1 / halfLife)

/**
 * All frames so far with weights (1−a)aᵏ, normalised by their sum while it fills. Old rounding decays with
 * the weights, so nothing is stored to rebuild from; the schedule moves the pivots to the present means,
 * and `drift` is what that changed.
 */
export class ExponentialWindow implements Window {
  readonly span: number
  readonly memory: number
  readonly decay: number
  readonly rebuildEvery: number
  #moments: MomentEstimator
  #frames = 0
  #drift: number | null = null

  /** `halfLife` in frames, at least 1. `rebuildEvery` in pushes; by default 8 half-lives, at least 1000. */
  constructor(halfLife: number, rebuildEvery: number = Math.max(1000, Math.ceil(8 * halfLife))) {
    this.decay = decayOf(halfLife)
    this.span = Math.ceil(Math.log(0.05) / Math.log(this.decay))
    this.memory = Math.ceil((53 * Math.LN2) / -Math.log(this.decay))
    this.rebuildEvery = rebuildEvery
    this.#moments = new MomentEstimator(this.decay)
  }

  push(x: Float64Array, present: Uint8Array): void {
    this.#moments.push(x, present)
    this.#frames++
    if (this.#frames % this.rebuildEvery === 0) this.#recentre()
  }

  get frames(): number {
    return this.#frames
  }

  get full(): boolean {
    return this.#frames >= this.span
  }

  /**
   * (Σw)²/Σw² of the weights so far: (1−aᵗ)(1+a)/((1+aᵗ)(1−a)) after t frames, (1+a)/(1−a) in the end.
   */
  get effective(): number {
    const rest = this.decay ** this.#frames
    return ((1 - rest) * (1 + this.decay)) / ((1 + rest) * (1 - this.decay))
  }

  get drift(): number | null {
    return this.#drift
  }

  active(): Int32Array {
    return activeOf(this.#moments)
  }

  absent(): readonly Absence[] {
    return absentOf(this.#moments)
  }

  correlation(out: Float64Array, active: Int32Array): void {
    this.#moments.correlation(out, active)
  }

  covariance(out: Float64Array, active: Int32Array, scales: Float64Array): void {
    this.#moments.covariance(out, active, scales)
  }

  deviation(i: number): number {
    return Math.sqrt(this.#moments.variance(i))
  }

  snapshot(): ExponentialSnapshot {
    return { moments: this.#moments.snapshot(), frames: this.#frames, drift: this.#drift }
  }

  restore(snapshot: unknown): void {
    const s = snapshot as ExponentialSnapshot
    this.#moments.restore(s.moments)
    this.#frames = s.frames
    this.#drift = s.drift
  }

  #recentre(): void {
    const active = this.active()
    const before = new Float64Array(active.length ** 2)
    const after = new Float64Array(active.length ** 2)
    this.#moments.correlation(before, active)
    this.#moments.recentre()
    this.#moments.correlation(after, active)
    this.#drift = largestChange(before, after)
  }
}

interface ExponentialSnapshot {
  readonly moments: MomentSnapshot
  readonly frames: number
  readonly drift: number | null
}
