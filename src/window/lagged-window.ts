import { FrameRing, type RingSnapshot } from './frame-ring.ts'
import type { Absence, Window } from './window.ts'

/**
 * A window as it was `lag` frames ago: the frames wait in a ring and enter the inner window when they are
 * `lag` frames old. One update a frame, no stored matrices.
 */
export class LaggedWindow implements Window {
  readonly lag: number
  #delay: FrameRing
  #inner: Window

  /** `inner` must be empty; `lag` in frames, at least 1. */
  constructor(inner: Window, lag: number) {
    this.#inner = inner
    this.lag = lag
    this.#delay = new FrameRing(lag)
  }

  push(x: Float64Array, present: Uint8Array): void {
    if (this.#delay.full) {
      const oldest = this.lag - 1
      this.#inner.push(this.#delay.values(oldest), this.#delay.present(oldest))
    }
    this.#delay.push(x, present)
  }

  get frames(): number {
    return this.#inner.frames
  }

  get full(): boolean {
    return this.#inner.full
  }

  get span(): number {
    return this.#inner.span + this.lag
  }

  get memory(): number {
    return this.#inner.memory + this.lag
  }

  get effective(): number {
    return this.#inner.effective
  }

  get decay(): number | null {
    return this.#inner.decay
  }

  get rebuildEvery(): number {
    return this.#inner.rebuildEvery
  }

  get drift(): number | null {
    return this.#inner.drift
  }

  active(): Int32Array {
    return this.#inner.active()
  }

  absent(): readonly Absence[] {
    return this.#inner.absent()
  }

  correlation(out: Float64Array, active: Int32Array): void {
    this.#inner.correlation(out, active)
  }

  covariance(out: Float64Array, active: Int32Array, scales: Float64Array): void {
    this.#inner.covariance(out, active, scales)
  }

  deviation(i: number): number {
    return this.#inner.deviation(i)
  }

  snapshot(): LaggedSnapshot {
    return { delay: this.#delay.snapshot(), inner: this.#inner.snapshot() }
  }

  restore(snapshot: unknown): void {
    const s = snapshot as LaggedSnapshot
    this.#delay.restore(s.delay)
    this.#inner.restore(s.inner)
  }
}

interface LaggedSnapshot {
  readonly delay: RingSnapshot
  readonly inner: unknown
}
