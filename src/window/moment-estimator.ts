import type { Estimator } from './estimator.ts'
import { GapMoments, type GapSnapshot } from './gap-moments.ts'
import { addOuter, decayOuter, exchangeOuter, triangleSize, undecayOuter } from './triangle.ts'

/** A weight below this is none: an entry so old in an exponential memory has left. */
const noWeight = 1e-30

/** Below this part of the largest second moment since the last rebuild, a variance is rounding. */
const rounding = 1e-12

/**
 * First and second moments of a set of frames under a boxcar (every frame counts 1) or an exponential
 * memory (weights (1−a)aᵏ, k frames ago).
 *
 * Missing entries contribute nothing: a signal's mean and variance are over its present entries, and the
 * centred second moment of a pair, Mᵢⱼ = Σ w·pᵢpⱼ(xᵢ−mᵢ)(xⱼ−mⱼ), is over the frames that have both. M is
 * the Gram matrix of the frames with gaps at the mean, hence positive semidefinite; a pair's correlation
 * Mᵢⱼ/√(MᵢᵢMⱼⱼ) is drawn towards 0 by the share of frames that lack one of the two.
 *
 * Everything is held relative to a pivot per signal (its first value, or its mean at the last rebuild), so
 * that a mean much larger than the deviations costs no digits. The roster may grow at any push.
 */
export class MomentEstimator implements Estimator {
  readonly decay: number | null
  #size = 0
  #total = 0
  #pivot = new Float64Array(0)
  #sum = new Float64Array(0)
  #count = new Float64Array(0)
  #peak = new Float64Array(0)
  #second = new Float64Array(0)
  #gaps: GapMoments | null = null
  #y = new Float64Array(0)
  #z = new Float64Array(0)
  #presentY = new Uint8Array(0)
  #presentZ = new Uint8Array(0)

  /** `decay`: a of the exponential memory, between 0 and 1; null for a boxcar. */
  constructor(decay: number | null = null) {
    this.decay = decay
  }

  /** Signals of the roster so far. */
  get size(): number {
    return this.#size
  }

  /** Weight of all frames: their number (boxcar), or 1 − aᵗ after t frames. */
  get total(): number {
    return this.#total
  }

  /** Weight of the frames in which signal i is present. */
  present(i: number): number {
    return i < this.#size ? this.#count[i]! : 0
  }

  push(x: Float64Array, present: Uint8Array): void {
    this.#grow(x.length)
    const n = this.#size
    this.#load(x, present, this.#y, this.#presentY, true)
    if (this.decay === null) {
      addOuter(this.#second, this.#y, n, 1)
      this.#weigh(this.#y, this.#presentY, 1)
    } else {
      const w = 1 - this.decay
      decayOuter(this.#second, this.#y, n, this.decay, w)
      this.#gaps?.scale(this.decay)
      this.#total *= this.decay
      for (let i = 0; i < n; i++) {
        this.#sum[i]! *= this.decay
        this.#count[i]! *= this.decay
        this.#peak[i]! *= this.decay
      }
      this.#weigh(this.#y, this.#presentY, w)
      this.#clearLeft()
    }
    this.#mark()
  }

  /** Boxcar: takes a frame out that was pushed before. Exponential: takes the last push back. */
  drop(x: Float64Array, present: Uint8Array): void {
    this.#grow(x.length)
    const n = this.#size
    this.#load(x, present, this.#y, this.#presentY, false)
    if (this.decay === null) {
      addOuter(this.#second, this.#y, n, -1)
      this.#weigh(this.#y, this.#presentY, -1)
    } else {
      const w = 1 - this.decay
      undecayOuter(this.#second, this.#y, n, this.decay, w)
      this.#weigh(this.#y, this.#presentY, -w)
      this.#gaps?.scale(1 / this.decay)
      this.#total /= this.decay
      for (let i = 0; i < n; i++) {
        this.#sum[i]! /= this.decay
        this.#count[i]! /= this.decay
      }
    }
    this.#clearLeft()
  }

  /** Boxcar only: one frame in and one out in a single pass over the matrix. */
  exchange(x: Float64Array, present: Uint8Array, out: Float64Array, outPresent: Uint8Array): void {
    this.#grow(Math.max(x.length, out.length))
    this.#load(x, present, this.#y, this.#presentY, true)
    this.#load(out, outPresent, this.#z, this.#presentZ, false)
    exchangeOuter(this.#second, this.#y, this.#z, this.#size)
    this.#weigh(this.#y, this.#presentY, 1)
    this.#weigh(this.#z, this.#presentZ, -1)
    this.#mark()
    this.#clearLeft()
  }

  /** Mean of signal i over its present entries, in the frames' unit; 0 when it has none. */
  mean(i: number): number {
    return this.present(i) > 0 ? this.#pivot[i]! + this.#sum[i]! / this.#count[i]! : 0
  }

  /** Variance (divisor: the weight present) of signal i; exactly 0 when it is no more than rounding. */
  variance(i: number): number {
    if (!(this.present(i) > 0)) return 0
    const own = this.#second[triangleSize(i) + i]!
    const centred = own - (this.#sum[i]! * this.#sum[i]!) / this.#count[i]!
    return centred > rounding * Math.max(own, this.#peak[i]!) ? centred / this.#count[i]! : 0
  }

  /**
   * Pearson correlation of the signals `active` (ascending roster indices, n of them) into `out`, n × n
   * row-major, in one pass. A signal without variance has correlation 0 with all others.
   */
  correlation(out: Float64Array, active: Int32Array): void {
    const scales = new Float64Array(this.#size)
    for (const i of active) scales[i] = Math.sqrt(this.variance(i))
    this.#fill(out, active, scales, 1)
    const n = active.length
    for (let a = 0; a < n; a++) out[a * n + a] = 1
  }

  /**
   * Covariance in units of fixed scales: cov(i, j)/(scales[i]·scales[j]) with `scales` by roster index.
   * A signal without a positive scale there is taken in its own.
   */
  covariance(out: Float64Array, active: Int32Array, scales: Float64Array): void {
    const own = new Float64Array(this.#size)
    for (const i of active) {
      const fixed = scales[i] ?? 0
      own[i] = fixed > 0 ? fixed : Math.sqrt(this.variance(i))
    }
    this.#fill(out, active, own, Number.POSITIVE_INFINITY)
  }

  /** Moves every pivot to the present mean: exact but for rounding, and the sums begin at 0 again. */
  recentre(): void {
    const n = this.#size
    const d = new Float64Array(n)
    for (let i = 0; i < n; i++) if (this.#count[i]! > 0) d[i] = this.#sum[i]! / this.#count[i]!
    for (let i = 0; i < n; i++) {
      for (let j = 0; j <= i; j++) {
        const k = triangleSize(i) + j
        this.#second[k] = this.#shifted(i, j, d[i]!, d[j]!)
      }
    }
    this.#gaps?.shift(d, this.#count, this.#total, n)
    for (let i = 0; i < n; i++) {
      this.#pivot[i]! += d[i]!
      this.#sum[i]! -= d[i]! * this.#count[i]!
      this.#peak[i] = Math.max(0, this.#second[triangleSize(i) + i]!)
    }
  }

  /** Empties it; the pivots become the means at this moment. */
  reset(): void {
    for (let i = 0; i < this.#size; i++) this.#pivot[i] = this.mean(i)
    this.#total = 0
    this.#gaps = null
    for (const a of [this.#sum, this.#count, this.#peak, this.#second]) a.fill(0)
  }

  /** Has a signal had so much larger moments since the last rebuild that their rounding would show? */
  get worn(): boolean {
    for (let i = 0; i < this.#size; i++) {
      const own = this.#second[triangleSize(i) + i]!
      if (this.#count[i]! > 0 && own !== 0 && own < 1e-6 * this.#peak[i]!) return true
    }
    return false
  }

  snapshot(): MomentSnapshot {
    const n = this.#size
    return {
      size: n,
      total: this.#total,
      pivot: this.#pivot.slice(0, n),
      sum: this.#sum.slice(0, n),
      count: this.#count.slice(0, n),
      peak: this.#peak.slice(0, n),
      second: this.#second.slice(0, triangleSize(n)),
      gaps: this.#gaps?.snapshot() ?? null,
    }
  }

  restore(s: MomentSnapshot): void {
    this.#size = 0
    this.#total = 0
    this.#gaps = null
    this.#allocate(Math.max(s.size, s.gaps?.stride ?? 0))
    this.#size = s.size
    this.#total = s.total
    const pairs: [Float64Array, Float64Array][] = [
      [this.#pivot, s.pivot],
      [this.#sum, s.sum],
      [this.#count, s.count],
      [this.#peak, s.peak],
      [this.#second, s.second],
    ]
    for (const [to, from] of pairs) {
      to.fill(0)
      to.set(from)
    }
    this.#gaps = s.gaps === null ? null : GapMoments.from(s.gaps).resized(this.#pivot.length)
  }

  /** Σ w·pᵢpⱼ(yᵢ−dᵢ)(yⱼ−dⱼ). */
  #shifted(i: number, j: number, di: number, dj: number): number {
    const s = this.#second[triangleSize(i) + j]!
    const gaps = this.#gaps
    if (gaps === null) return s - di * this.#sum[j]! - dj * (this.#sum[i]! - di * this.#total)
    const both = this.#count[i]! + this.#count[j]! - this.#total + gaps.both(i, j)
    const sumJ = this.#sum[j]! - gaps.sum(i, j)
    const sumI = this.#sum[i]! - gaps.sum(j, i)
    return s - di * sumJ - dj * (sumI - di * both)
  }

  /** No entry's size exceeds `most`. */
  #fill(out: Float64Array, active: Int32Array, scales: Float64Array, most: number): void {
    const n = active.length
    const means = new Float64Array(n)
    const factors = new Float64Array(n)
    for (let a = 0; a < n; a++) {
      const i = active[a]!
      const count = this.present(i)
      means[a] = count > 0 ? this.#sum[i]! / count : 0
      factors[a] = count > 0 && scales[i]! > 0 ? 1 / (scales[i]! * Math.sqrt(count)) : 0
    }
    if (this.#gaps === null) {
      this.#fillWithoutGaps(out, active, means, factors, most)
      return
    }
    for (let a = 0; a < n; a++) {
      for (let b = 0; b <= a; b++) {
        const own = this.#shifted(active[a]!, active[b]!, means[a]!, means[b]!) * factors[a]! * factors[b]!
        const m = Math.min(most, Math.max(-most, own))
        out[a * n + b] = m
        out[b * n + a] = m
      }
    }
  }

  #fillWithoutGaps(
    out: Float64Array,
    active: Int32Array,
    means: Float64Array,
    factors: Float64Array,
    most: number,
  ): void {
    const n = active.length
    const second = this.#second
    const first = active[0] ?? 0
    const together = n > 0 && active[n - 1]! - first === n - 1
    let largest = 0
    let least = 0
    for (let a = 0; a < n; a++) {
      const row = triangleSize(active[a]!)
      const sum = this.#sum[active[a]!]!
      const factor = factors[a]!
      for (let b = 0; b < a; b++) {
        const own = together ? second[row + first + b]! : second[row + active[b]!]!
        const m = (own - sum * means[b]!) * factor * factors[b]!
        out[a * n + b] = m
        out[b * n + a] = m
        if (m > largest) largest = m
        else if (m < least) least = m
      }
      out[a * n + a] = (second[row + active[a]!]! - sum * means[a]!) * factor * factor
    }
    if (largest <= most && least >= -most) return
    for (let k = 0; k < n * n; k++) if (Math.abs(out[k]!) > most) out[k] = Math.sign(out[k]!) * most
  }

  #load(x: Float64Array, present: Uint8Array, y: Float64Array, p: Uint8Array, entering: boolean): void {
    for (let i = 0; i < this.#size; i++) {
      const here = i < x.length && present[i] !== 0
      p[i] = here ? 1 : 0
      if (!here) {
        y[i] = 0
        continue
      }
      if (entering && this.#count[i] === 0) this.#pivot[i] = x[i]!
      y[i] = x[i]! - this.#pivot[i]!
    }
  }

  #weigh(y: Float64Array, present: Uint8Array, w: number): void {
    let missing = false
    for (let i = 0; i < this.#size; i++) {
      if (present[i] === 0) {
        missing = true
        continue
      }
      this.#sum[i]! += w * y[i]!
      this.#count[i]! += w
    }
    if (missing) {
      this.#gaps ??= new GapMoments(this.#pivot.length)
      this.#gaps.add(y, present, this.#size, w)
    }
    this.#total += w
  }

  #mark(): void {
    for (let i = 0; i < this.#size; i++) {
      const own = this.#second[triangleSize(i) + i]!
      if (own > this.#peak[i]!) this.#peak[i] = own
    }
  }

  /** A signal whose last present entry has left leaves nothing behind, not even rounding. */
  #clearLeft(): void {
    for (let i = 0; i < this.#size; i++) {
      if (this.#count[i]! > noWeight || (this.#count[i] === 0 && this.#peak[i] === 0)) continue
      this.#sum[i] = 0
      this.#count[i] = 0
      this.#peak[i] = 0
      this.#second.fill(0, triangleSize(i), triangleSize(i + 1))
      for (let k = i + 1; k < this.#size; k++) this.#second[triangleSize(k) + i] = 0
      this.#gaps?.clear(i, this.#size)
    }
  }

  #grow(n: number): void {
    if (n <= this.#size) return
    if (n > this.#pivot.length) this.#allocate(Math.max(n, Math.ceil(1.5 * this.#pivot.length)))
    if (this.#total > 0) {
      this.#gaps ??= new GapMoments(this.#pivot.length)
      for (let i = this.#size; i < n; i++) this.#gaps.enter(i, this.#sum, this.#count, this.#total)
    }
    this.#size = n
  }

  #allocate(capacity: number): void {
    if (capacity <= this.#pivot.length) return
    const wider = (a: Float64Array, length: number): Float64Array<ArrayBuffer> => {
      const b = new Float64Array(length)
      b.set(a)
      return b
    }
    this.#pivot = wider(this.#pivot, capacity)
    this.#sum = wider(this.#sum, capacity)
    this.#count = wider(this.#count, capacity)
    this.#peak = wider(this.#peak, capacity)
    this.#second = wider(this.#second, triangleSize(capacity))
    this.#y = new Float64Array(capacity)
    this.#z = new Float64Array(capacity)
    this.#presentY = new Uint8Array(capacity)
    this.#presentZ = new Uint8Array(capacity)
    this.#gaps = this.#gaps?.resized(capacity) ?? null
  }
}

export interface MomentSnapshot {
  readonly size: number
  readonly total: number
  readonly pivot: Float64Array
  readonly sum: Float64Array
  readonly count: Float64Array
  readonly peak: Float64Array
  readonly second: Float64Array
  readonly gaps: GapSnapshot | null
}
