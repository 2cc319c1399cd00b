/**
 * What missing entries take away from the moments, so that means are over present entries only:
 * `sums[i,j]` = Σ w·(1−pᵢ)·yⱼ (the part of signal j's sum that fell into frames without i) and
 * `both[i,j]` = Σ w·(1−pᵢ)(1−pⱼ). A frame without gaps costs nothing (boxcar), a gap O(N).
 */
export class GapMoments {
  #stride: number
  #sums: Float64Array
  #both: Float64Array

  constructor(stride: number) {
    this.#stride = stride
    this.#sums = new Float64Array(stride * stride)
    this.#both = new Float64Array(stride * stride)
  }

  sum(i: number, j: number): number {
    return this.#sums[i * this.#stride + j]!
  }

  both(i: number, j: number): number {
    return this.#both[i * this.#stride + j]!
  }

  /** Adds w times one frame; `y` is 0 where the entry is missing. */
  add(y: Float64Array, present: Uint8Array, n: number, w: number): void {
    for (let i = 0; i < n; i++) {
      if (present[i] !== 0) continue
      const row = i * this.#stride
      for (let j = 0; j < n; j++) {
        if (present[j] === 0) this.#both[row + j]! += w
        else this.#sums[row + j]! += w * y[j]!
      }
    }
  }

  scale(a: number): void {
    for (let k = 0; k < this.#sums.length; k++) {
      this.#sums[k]! *= a
      this.#both[k]! *= a
    }
  }

  /** Signal i is new: all of the past is missing. `total` is the weight of all frames so far. */
  enter(i: number, sum: Float64Array, count: Float64Array, total: number): void {
    const row = i * this.#stride
    for (let j = 0; j < i; j++) {
      const missing = total - count[j]!
      this.#sums[row + j] = sum[j]!
      this.#both[row + j] = missing
      this.#both[j * this.#stride + i] = missing
    }
    this.#both[row + i] = total
  }

  /** No present entry of signal j is left: what rounding left of its sums goes too. */
  clear(j: number, n: number): void {
    for (let i = 0; i < n; i++) this.#sums[i * this.#stride + j] = 0
  }

  /** Moves signal j's pivot by d[j]: yⱼ becomes yⱼ − d[j] in every present entry. */
  shift(d: Float64Array, count: Float64Array, total: number, n: number): void {
    for (let i = 0; i < n; i++) {
      for (let j = 0; j < n; j++) {
        const k = i * this.#stride + j
        this.#sums[k]! -= d[j]! * (total - count[i]! - this.#both[k]!)
      }
    }
  }

  resized(stride: number): GapMoments {
    const wide = new GapMoments(stride)
    const n = Math.min(this.#stride, stride)
    for (let i = 0; i < n; i++) {
      wide.#sums.set(this.#sums.subarray(i * this.#stride, i * this.#stride + n), i * stride)
      wide.#both.set(this.#both.subarray(i * this.#stride, i * this.#stride + n), i * stride)
    }
    return wide
  }

  snapshot(): GapSnapshot {
    return { stride: this.#stride, sums: this.#sums.slice(), both: this.#both.slice() }
  }

  static from(snapshot: GapSnapshot): GapMoments {
    const gaps = new GapMoments(snapshot.stride)
    gaps.#sums.set(snapshot.sums)
    gaps.#both.set(snapshot.both)
    return gaps
  }
}

export interface GapSnapshot {
  readonly stride: number
  readonly sums: Float64Array
  readonly both: Float64Array
}
