/**
 * Seeded random numbers: xoshiro128** (Blackman & Vigna 2018), its state filled from the seed by a 32-bit
 * mixing function. The same seed gives the same numbers on every run.
 */
export class Random {
  readonly #state = new Uint32Array(4)
  #spare = Number.NaN

  constructor(seed: number) {
    let x = seed >>> 0
    for (let i = 0; i < 4; i++) {
      x = (x + 0x9e3779b9) >>> 0
      let z = x
      z = Math.imul(z ^ (z >>> 16), 0x85ebca6b)
      z = Math.imul(z ^ (z >>> 13), 0xc2b2ae35)
      this.#state[i] = (z ^ (z >>> 16)) >>> 0
    }
  }

  /** 32 random bits as a number from 0 to 2³² − 1. */
  bits(): number {
    const s = this.#state
    const s1 = s[1]!
    const x = Math.imul(s1, 5)
    const result = Math.imul((x << 7) | (x >>> 25), 9) >>> 0
    s[2]! ^= s[0]!
    s[3]! ^= s1
    s[1]! ^= s[2]!
    s[0]! ^= s[3]!
    s[2]! ^= s1 << 9
    const top = s[3]!
    s[3] = (top << 11) | (top >>> 21)
    return result
  }

  /** Uniform in (0, 1): never exactly 0, so that its logarithm is finite. */
  uniform(): number {
    const high = this.bits() >>> 5
    const low = this.bits() >>> 6
    return (high * 67_108_864 + low + 0.5) / 9_007_199_254_740_992
  }

  /** A whole number from 0 to n − 1. */
  below(n: number): number {
    return Math.floor(this.uniform() * n)
  }

  /** Standard normal (Box & Muller 1958). */
  normal(): number {
    if (!Number.isNaN(this.#spare)) {
      const spare = this.#spare
      this.#spare = Number.NaN
      return spare
    }
    const radius = Math.sqrt(-2 * Math.log(this.uniform()))
    const angle = 2 * Math.PI * this.uniform()
    this.#spare = radius * Math.sin(angle)
    return radius * Math.cos(angle)
  }

  /** Exponential of mean 1. */
  exponential(): number {
    return -Math.log(this.uniform())
  }

  /**
   * Student's t with 4 degrees of freedom, scaled to variance 1. A χ² of 4 degrees is −2 ln(u₁u₂), and the
   * variance of t₄ is 2.
   */
  fatTailed(): number {
    const chiSquare = -2 * Math.log(this.uniform() * this.uniform())
    return this.normal() / Math.sqrt(chiSquare / 4) / Math.SQRT2
  }

  /** The numbers 0 to n − 1 in random order (Fisher & Yates). */
  permutation(n: number): Int32Array {
    const order = Int32Array.from({ length: n }, (_, i) => i)
    for (let i = n - 1; i > 0; i--) {
      const j = this.below(i + 1)
      const held = order[i]!
      order[i] = order[j]!
      order[j] = held
    }
    return order
  }
}
