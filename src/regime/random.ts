/**
 * Seeded random numbers, the same on every machine: xoshiro128** (Blackman & Vigna 2018, from memory),
 * its state filled from the seed by a Weyl sequence with a mixing step.
 */
export class Random {
  readonly state: Uint32Array

  constructor(seed: number) {
    this.state = new Uint32Array(4)
    let z = seed >>> 0
    for (let k = 0; k < 4; k++) {
      z = (z + 0x9e3779b9) >>> 0
      let m = Math.imul(z ^ (z >>> 16), 0x21f0aaad)
      m = Math.imul(m ^ (m >>> 15), 0x735a2d97)
      this.state[k] = (m ^ (m >>> 15)) >>> 0
    }
  }

  /** A whole number from 0 to below `limit`. */
  below(limit: number): number {
    return Math.floor(this.unit() * limit)
  }

  /** Uniform in [0, 1), 32 bits. */
  unit(): number {
    const s = this.state
    const r = Math.imul(s[1]!, 5)
    const out = Math.imul((r << 7) | (r >>> 25), 9) >>> 0
    const t = s[1]! << 9
    s[2]! ^= s[0]!
    s[3]! ^= s[1]!
    s[1]! ^= s[2]!
    s[0]! ^= s[3]!
    s[2]! ^= t
    s[3] = (s[3]! << 11) | (s[3]! >>> 21)
    return out / 4294967296
  }

  /** Standard normal (Box & Muller 1958). */
  normal(): number {
    return Math.sqrt(-2 * Math.log(1 - this.unit())) * Math.cos(2 * Math.PI * this.unit())
  }
}
