import { FrameRing, type RingSnapshot } from './frame-ring.ts'
import { MomentEstimator, type MomentSnapshot } from './moment-estimator.ts'
import { type Absence, absentOf, activeOf, largestChange, type Window } from './window.ts'

/**
 * The last T frames, each with weight 1. One frame in and one out is one pass over the moments; rounding
 * is bounded by rebuilding them from the stored frames every `rebuildEvery` pushes, and at once when a
 * signal's moments have shrunk so far that the rounding of the larger ones would show.
 */
export class BoxcarWindow implements Window {
  readonly span: number
  readonly memory: number
  readonly decay = null
  readonly rebuildEvery: number
  #ring: FrameRing
  #moments = new MomentEstimator()
  #sinceRebuild = 0
  #drift: number | null = null

  /** `frames`: T, at least 2. `rebuildEvery` in pushes; by default 8 T, at least 1000. */
  constructor(frames: number, rebuildEvery: number = Math.max(1000, 8 * frames)) {
    this.span = frames
    this.memory = frames
    this.rebuildEvery = rebuildEvery
    this.#ring = new FrameRing(frames)
  }

  push(x: Float64Array, present: Uint8Array): void {
    if (this.#ring.full) {
      const oldest = this.span - 1
      this.#moments.exchange(x, present, this.#ring.values(oldest), this.#ring.present(oldest))
    } else {
      this.#moments.push(x, present)
    }
    this.#ring.push(x, present)
    this.#sinceRebuild++
    if (this.#sinceRebuild >= this.rebuildEvery) this.#drift = this.#rebuild()
    else if (this.#moments.worn) this.#rebuild()
  }

  get frames(): number {
    return this.#ring.length
  }

  get full(): boolean {
    return this.#ring.full
  }

  get effective(): number {
    return this.#ring.length
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

  snapshot(): BoxcarSnapshot {
    return {
      ring: this.#ring.snapshot(),
      moments: this.#moments.snapshot(),
      sinceRebuild: this.#sinceRebuild,
      drift: this.#drift,
    }
  }

  restore(snapshot: unknown): void {
    const s = snapshot as BoxcarSnapshot
    this.#ring.restore(s.ring)
    this.#moments.restore(s.moments)
    this.#sinceRebuild = s.sinceRebuild
    this.#drift = s.drift
  }

  #rebuild(): number {
    const active = this.active()
    const before = new Float64Array(active.length ** 2)
    const after = new Float64Array(active.length ** 2)
    this.#moments.correlation(before, active)
    this.#moments.reset()
    for (let ago = this.#ring.length - 1; ago >= 0; ago--) {
      this.#moments.push(this.#ring.values(ago), this.#ring.present(ago))
    }
    this.#moments.correlation(after, active)
    this.#sinceRebuild = 0
    return largestChange(before, after)
  }
}

interface BoxcarSnapshot {
  readonly ring: RingSnapshot
  readonly moments: MomentSnapshot
  readonly sinceRebuild: number
  readonly drift: number | null
}
