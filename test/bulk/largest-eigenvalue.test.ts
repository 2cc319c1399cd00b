import { readFileSync } from 'node:fs'
import { describe, expect, it } from 'vitest'
import { exponentialCentring } from '../../src/bulk/exponential-centring.ts'
import { correctedCentring, johnstoneCentring, noiseLimit } from '../../src/bulk/johnstone.ts'
import { boxcarNoise, exponentialNoise } from '../../src/bulk/noise-model.ts'
import {
  tracyWidomCdf,
  tracyWidomDensity,
  tracyWidomQuantile,
  tracyWidomSurvival,
  tracyWidomUpper,
} from '../../src/bulk/tracy-widom.ts'
import { Random } from '../support/random.ts'
import { fourDeviations, memoryWeights, normalSignals, spectrumOf } from './noise.ts'

describe('Tracy–Widom law, β = 1', () => {
  it.each([
    [0.05, -3.18038],
    [0.1, -2.7824279],
    [0.5, -1.2685746],
    [0.9, 0.45014329],
    [0.95, 0.97931605],
    [0.99, 2.0234493],
    [0.995, 2.4223266],
    [0.999, 3.2721961],
  ])('quantile %d is %d (Tracy & Widom 1996; table of check values)', (p, s) => {
    expect(Math.abs(tracyWidomQuantile(p) - s)).toBeLessThan(1e-6)
    expect(tracyWidomCdf(s)).toBeCloseTo(p, 7)
    expect(tracyWidomUpper(1 - p)).toBeCloseTo(tracyWidomQuantile(p), 10)
  })

  it('has its mean, variance, skewness and excess kurtosis (Bornemann 2010)', () => {
    const moment = (f: (s: number) => number): number => {
      let sum = 0
      for (let k = 0; k < 20_000; k++)
        sum += f(-8 + (k + 0.5) * 1e-3) * tracyWidomDensity(-8 + (k + 0.5) * 1e-3)
      return sum * 1e-3
    }
    const mean = moment((s) => s)
    const variance = moment((s) => (s - mean) ** 2)
    expect(moment(() => 1)).toBeCloseTo(1, 9)
    expect(mean).toBeCloseTo(-1.2065336, 6)
    expect(variance).toBeCloseTo(1.607781, 6)
    expect(moment((s) => (s - mean) ** 3) / variance ** 1.5).toBeCloseTo(0.2934645, 6)
    expect(moment((s) => (s - mean) ** 4) / variance ** 2 - 3).toBeCloseTo(0.165243, 5)
  })

  it('keeps the relative precision of rare levels, within the table and beyond', () => {
    for (const level of [1e-3, 1e-6, 1e-9, 1e-12, 1e-15, 1e-30]) {
      expect(tracyWidomSurvival(tracyWidomUpper(level)) / level).toBeCloseTo(1, 6)
    }
    // leading term of the tail, exp(−⅔ s^{3/2})/(4√π s^{3/4}); the next is of relative size s^{−3/2}
    const tail = (s: number): number => Math.exp((-2 / 3) * s ** 1.5) / (4 * Math.sqrt(Math.PI) * s ** 0.75)
    for (const s of [8, 11, 14])
      expect(Math.abs(tracyWidomSurvival(s) / tail(s) - 1)).toBeLessThan(1.5 * s ** -1.5)
  })

  it('rises monotonously over all numbers and refuses what is no probability', () => {
    let before = 0
    for (let s = -14; s < 20; s += 0.01) {
      expect(tracyWidomCdf(s)).toBeGreaterThanOrEqual(before)
      before = tracyWidomCdf(s)
    }
    expect(tracyWidomQuantile(1e-14)).toBeLessThan(-8)
    for (const p of [0, 1, -1, Number.NaN]) {
      expect(() => tracyWidomQuantile(p)).toThrow(RangeError)
      expect(() => tracyWidomUpper(p)).toThrow(RangeError)
    }
  })
})

describe('centring of the largest eigenvalue', () => {
  it.each([
    [10, 10, 37.97367, 5.336804],
    [100, 100, 397.99749, 11.67654],
    [100, 30, 237.99541, 10.12946],
    [400, 100, 898.49969, 15.9288],
  ])('n = %i, p = %i: μ and σ (Johnstone 2001)', (n, p, centre, scale) => {
    expect(johnstoneCentring(n, p).centre).toBeCloseTo(centre, 4)
    expect(johnstoneCentring(n, p).scale).toBeCloseTo(scale, 5)
  })

  it('95 % and 99 % limits of λ1 for n = 100, p = 30, means known (table of check values)', () => {
    const { centre, scale } = johnstoneCentring(100, 30)
    expect((centre + scale * tracyWidomUpper(0.05)) / 100).toBeCloseTo(2.47915, 5)
    expect((centre + scale * tracyWidomUpper(0.01)) / 100).toBeCloseTo(2.58491, 4)
    // with n − ½ and p − ½ the limits lie lower by what Johnstone's is too wide
    expect(noiseLimit(100, 30, 0.05)).toBeCloseTo(2.47278, 4)
  })

  // the table's figures come from 20,000 draws for 10 × 10 and 2,000 for 100 × 100
  it.each([
    [10, 20_000, 4000, [0.001, 0.016, 0.052, 0.252, 0.481, 0.704, 0.905, 0.95, 0.989]],
    [100, 2000, 200, [0.009, 0.035, 0.088, 0.3, 0.502, 0.704, 0.896, 0.951, 0.989]],
  ])(
    'P((λ1 − μ)/σ ≤ quantile), square of order %i (table 1 of Johnstone 2001, as simulated in the table)',
    (n, drawn, draws, table) => {
      const random = new Random(21)
      const { centre, scale } = johnstoneCentring(n, n)
      const found = Array.from(
        { length: draws },
        () => (n * spectrumOf(normalSignals(random, n, n), { known: true }).values[0]! - centre) / scale,
      )
      for (const [k, p] of [0.01, 0.05, 0.1, 0.3, 0.5, 0.7, 0.9, 0.95, 0.99].entries()) {
        const share = found.filter((s) => s <= tracyWidomQuantile(p)).length / draws
        const expected = table[k]!
        expect(Math.abs(share - expected)).toBeLessThan(
          fourDeviations(expected, draws) + fourDeviations(expected, drawn) + 0.001,
        )
      }
    },
  )

  it('for 20 × 5 the .95 point is reached with probability .954 by n − ½, p − ½, and .962 by n − 1, p (Ma 2012)', () => {
    const random = new Random(22)
    const draws = 20_000
    const found = Array.from(
      { length: draws },
      () => 20 * spectrumOf(normalSignals(random, 5, 20), { known: true }).values[0]!,
    )
    const reached = ({ centre, scale }: { centre: number; scale: number }): number =>
      found.filter((x) => x <= centre + scale * tracyWidomQuantile(0.95)).length / draws
    expect(Math.abs(reached(correctedCentring(20, 5)) - 0.954)).toBeLessThan(0.005)
    expect(Math.abs(reached(johnstoneCentring(20, 5)) - 0.962)).toBeLessThan(0.005)
  })
})

describe('the largest eigenvalue of a correlation matrix', () => {
  const { rows } = JSON.parse(
    readFileSync(new URL('./reference/correlation-edge.json', import.meta.url), 'utf8'),
  ) as { rows: { p: number; frames: number; draws: number; mean: number; deviation: number }[] }

  it.each(rows)('lies where numpy finds it: p = $p, $frames degrees of freedom', (row) => {
    const { p, frames, draws, mean, deviation } = row
    const { centre, scale } = boxcarNoise.correlation(p, frames + 1)
    const error = deviation / Math.sqrt(draws)
    expect(Math.abs(centre - 1.2065336 * scale - mean)).toBeLessThan(
      4 * error + (p < 10 ? 0.25 : 0.1) * deviation,
    )
    expect(Math.abs((scale * Math.sqrt(1.607781)) / deviation - 1)).toBeLessThan(
      4 / Math.sqrt(2 * draws) + (p < 10 ? 0.2 : 0.08),
    )
  })
})

describe('the level is kept on simulated noise', () => {
  /** Shares of draws beyond the limits of 10, 5 and 1 %. */
  const beyond = (
    largest: readonly number[],
    { centre, scale }: { centre: number; scale: number },
  ): number[] =>
    [0.1, 0.05, 0.01].map(
      (level) => largest.filter((x) => x > centre + scale * tracyWidomUpper(level)).length / largest.length,
    )

  it.each([
    [10, 100, 3000],
    [30, 100, 1200],
    [60, 30, 800],
  ])('boxcar, covariance with means known: N = %i, n = %i', (n, frames, draws) => {
    const random = new Random(31)
    const largest = Array.from(
      { length: draws },
      () => spectrumOf(normalSignals(random, n, frames), { known: true }).values[0]!,
    )
    const shares = beyond(largest, boxcarNoise.covariance(n, frames + 1))
    for (const [k, level] of [0.1, 0.05, 0.01].entries()) {
      expect(Math.abs(shares[k]! - level)).toBeLessThan(fourDeviations(level, draws) + 0.05 * level)
    }
  })

  it.each([
    [5, 50, 4000],
    [10, 20, 4000],
    [30, 100, 1200],
    [60, 30, 1000],
  ])('boxcar, correlation: N = %i, T = %i', (n, frames, draws) => {
    const random = new Random(32)
    const largest = Array.from(
      { length: draws },
      () => spectrumOf(normalSignals(random, n, frames)).values[0]!,
    )
    const shares = beyond(largest, boxcarNoise.correlation(n, frames))
    // the damping was fitted: a fifth of the level is allowed for it
    for (const [k, level] of [0.1, 0.05, 0.01].entries()) {
      expect(Math.abs(shares[k]! - level)).toBeLessThan(fourDeviations(level, draws) + 0.2 * level)
    }
    // and without it the limit would be several times too rare
    expect(beyond(largest, boxcarNoise.covariance(n, frames))[1]).toBeLessThan(0.02)
  })

  it.each([
    [10, 30, 1500],
    [30, 20, 700],
    [60, 15, 350],
  ])('exponential memory, covariance with means known: N = %i, half-life %i', (n, halfLife, draws) => {
    const random = new Random(33)
    const { weights, effective } = memoryWeights(halfLife)
    const largest = Array.from(
      { length: draws },
      () => spectrumOf(normalSignals(random, n, weights.length), { weights, known: true }).values[0]!,
    )
    const shares = beyond(largest, exponentialCentring(n, (2 * n) / effective))
    for (const [k, level] of [0.1, 0.05, 0.01].entries()) {
      expect(Math.abs(shares[k]! - level)).toBeLessThan(fourDeviations(level, draws) + 0.2 * level)
    }
  })

  it('exponential memory, correlation: at most the level, N = 30, half-life 40', () => {
    const random = new Random(34)
    const { weights, effective } = memoryWeights(40)
    const draws = 400
    const largest = Array.from(
      { length: draws },
      () => spectrumOf(normalSignals(random, 30, weights.length), { weights }).values[0]!,
    )
    const shares = beyond(largest, exponentialNoise.correlation(30, effective))
    const plain = beyond(largest, exponentialNoise.covariance(30, effective))
    for (const [k, level] of [0.1, 0.05, 0.01].entries()) {
      expect(shares[k]).toBeLessThan(level + fourDeviations(level, draws))
      expect(shares[k]).toBeGreaterThanOrEqual(plain[k]!)
    }
    expect(shares[0]).toBeGreaterThan(0.03)
  })
})
