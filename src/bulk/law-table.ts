/** The law of a bulk: where it lies and how its mass is spread. Noise variance 1. */
export interface BulkLaw {
  readonly lower: number
  readonly upper: number
  /** Density of the continuous part; its mass may be below 1 (the rest lies on 0). */
  density(x: number): number
}

const pieces = 400

/**
 * Distribution function and quantiles of a law by its density, integrated in the angle between the edges,
 * which takes the square-root ends of a bulk without loss (midpoint rule, 400 pieces: about 1e-7).
 */
export class LawTable {
  readonly law: BulkLaw
  readonly #below = new Float64Array(pieces + 1)
  /** Mass on 0: what the density does not hold. */
  readonly atom: number

  constructor(law: BulkLaw) {
    this.law = law
    let mass = 0
    for (let k = 0; k < pieces; k++) {
      const angle = ((k + 0.5) * Math.PI) / pieces
      mass += (law.density(this.#at(angle)) * this.#half * Math.sin(angle) * Math.PI) / pieces
      this.#below[k + 1] = mass
    }
    this.atom = Math.max(0, 1 - mass)
  }

  /** P(X ≤ x). */
  cdf(x: number): number {
    if (x < 0) return 0
    if (x <= this.law.lower) return this.atom < 1e-4 ? 0 : this.atom
    if (x >= this.law.upper) return 1
    const place = (Math.acos(1 - (x - this.law.lower) / this.#half) / Math.PI) * pieces
    const k = Math.min(pieces - 1, Math.floor(place))
    const below = this.#below[k]! + (place - k) * (this.#below[k + 1]! - this.#below[k]!)
    return Math.min(1, (this.atom < 1e-4 ? 0 : this.atom) + below)
  }

  quantile(p: number): number {
    let low = this.law.lower
    let high = this.law.upper
    for (let step = 0; step < 60; step++) {
      const middle = (low + high) / 2
      if (this.cdf(middle) < p) low = middle
      else high = middle
    }
    return (low + high) / 2
  }

  get #half(): number {
    return (this.law.upper - this.law.lower) / 2
  }

  #at(angle: number): number {
    return this.law.lower + this.#half * (1 - Math.cos(angle))
  }
}

/** Kolmogorov–Smirnov distance between a law, stretched by `variance`, and eigenvalues sorted either way. */
export function kolmogorovSmirnov(values: Float64Array, table: LawTable, variance: number): number {
  const sorted = values.slice().sort()
  const n = sorted.length
  if (n === 0 || !(variance > 0)) return 0
  let distance = 0
  for (let i = 0; i < n; i++) {
    const expected = table.cdf(Math.max(0, sorted[i]! / variance))
    distance = Math.max(distance, Math.abs(expected - i / n), Math.abs((i + 1) / n - expected))
  }
  return distance
}
