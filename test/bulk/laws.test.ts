import { describe, expect, it } from 'vitest'
import type { BulkLaw } from '../../src/bulk/edges.ts'
import { effectiveFrames } from '../../src/bulk/effective-frames.ts'
import { exponentialDensity, exponentialEdges, exponentialLaw } from '../../src/bulk/exponential-memory.ts'
import {
  marchenkoPasturCdf,
  marchenkoPasturDensity,
  marchenkoPasturEdges,
  marchenkoPasturLaw,
  marchenkoPasturMeanLog,
  marchenkoPasturMoment,
  marchenkoPasturQuantile,
} from '../../src/bulk/marchenko-pastur.ts'
import { semicircleCdf, semicircleDensity, semicircleMoment } from '../../src/bulk/semicircle.ts'
import { wachterEdges } from '../../src/bulk/wachter.ts'
import { PlainSolver } from '../../src/spectrum/plain-solver.ts'
import { Random } from '../support/random.ts'
import { meanOf, memoryWeights, normalSignals, spectrumOf } from './noise.ts'

/** ∫ f over [a, b] by the midpoint rule in an angle, which takes square-root ends without loss. */
function integral(f: (x: number) => number, a: number, b: number, pieces = 4000): number {
  let sum = 0
  for (let k = 0; k < pieces; k++) {
    const angle = ((k + 0.5) * Math.PI) / pieces
    const x = (a + b) / 2 - ((b - a) / 2) * Math.cos(angle)
    sum += (f(x) * Math.sin(angle) * (b - a) * Math.PI) / (2 * pieces)
  }
  return sum
}

describe('Marchenko–Pastur law (Marchenko & Pastur 1967; figures: table of check values)', () => {
  it.each([
    [0.3, 0.204554885, 2.395445115, 0.8990313907],
    [0.12, 0.427179677, 1.812820323, 0.9598529871],
    [0.25, 0.25, 2.25, 0.9160040707],
    [0.5, 0.0857864376, 2.9142135624, 0.8304658816],
  ])('q = %d: edges and median', (q, lower, upper, median) => {
    expect(marchenkoPasturEdges(q).lower).toBeCloseTo(lower, 9)
    expect(marchenkoPasturEdges(q).upper).toBeCloseTo(upper, 9)
    expect(marchenkoPasturQuantile(0.5, q)).toBeCloseTo(median, 9)
    expect(marchenkoPasturQuantile(0.5, q, 3)).toBeCloseTo(3 * median, 8)
  })

  it('q = .3: F(1) and f(1)', () => {
    expect(marchenkoPasturCdf(1, 0.3)).toBeCloseTo(0.558562, 6)
    expect(marchenkoPasturDensity(1, 0.3)).toBeCloseTo(0.558934, 6)
  })

  it.each([0.05, 0.3, 1, 2.5])('q = %d: moments and E ln λ by formula and by quadrature', (q) => {
    const { lower, upper } = marchenkoPasturEdges(q)
    const moments = [Math.min(1, 1 / q), 1, 1 + q, 1 + 3 * q + q * q, 1 + 6 * q + 6 * q * q + q ** 3]
    moments.forEach((expected, k) => {
      const found = integral((x) => x ** k * marchenkoPasturDensity(x, q), lower, upper)
      expect(found / expected).toBeCloseTo(1, 6)
      if (k > 0) expect(marchenkoPasturMoment(k, q) / expected).toBeCloseTo(1, 13)
    })
    if (q < 1) {
      const found = integral((x) => Math.log(x) * marchenkoPasturDensity(x, q), lower, upper)
      expect(marchenkoPasturMeanLog(q)).toBeCloseTo(found, 6)
      expect(marchenkoPasturMeanLog(q)).toBeCloseTo(-1 + ((q - 1) / q) * Math.log(1 - q), 12)
    }
    expect(marchenkoPasturMoment(2, q, 3)).toBeCloseTo(9 * (1 + q), 10)
  })

  it.each([0.01, 0.3, 1, 2, 30])('q = %d: the distribution function is the integral of the density', (q) => {
    const { lower, upper } = marchenkoPasturEdges(q)
    for (const part of [0.01, 0.2, 0.5, 0.9, 0.999]) {
      const x = lower + part * (upper - lower)
      const below = integral((y) => marchenkoPasturDensity(y, q), lower, x, 40_000)
      expect(marchenkoPasturCdf(x, q)).toBeCloseTo(Math.max(0, 1 - 1 / q) + below, q === 1 ? 3 : 6)
      expect(marchenkoPasturQuantile(marchenkoPasturCdf(x, q), q) / x).toBeCloseTo(1, 9)
    }
    expect(marchenkoPasturCdf(upper, q)).toBeCloseTo(1, 12)
    expect(marchenkoPasturCdf(-1e-9, q)).toBe(0)
  })

  it('for N > T holds a mass of 1 − T/N at 0', () => {
    expect(marchenkoPasturCdf(0, 4)).toBe(0.75)
    expect(marchenkoPasturQuantile(0.7, 4)).toBe(0)
  })

  it('has the edges of the published stock studies', () => {
    // N = 1000, 6,448 half-hour returns (Plerou et al. 2002)
    expect(marchenkoPasturEdges(1000 / 6448).lower).toBeCloseTo(0.367465, 6)
    expect(marchenkoPasturEdges(1000 / 6448).upper).toBeCloseTo(1.94271, 5)
    // N = 406, T = 1309 and variances 1, .85, .74 (Laloux et al. 1999)
    for (const [variance, lower, upper] of [
      [1, 0.1963, 2.424],
      [0.85, 0.1669, 2.0604],
      [0.74, 0.1453, 1.7938],
    ] as const) {
      expect(marchenkoPasturEdges(406 / 1309, variance).lower).toBeCloseTo(lower, 4)
      expect(marchenkoPasturEdges(406 / 1309, variance).upper).toBeCloseTo(upper, 4)
    }
  })
})

describe('exponential memory (Pafka, Potters & Kondor 2004; figures: table of check values)', () => {
  it.each([
    [1, 0.1585943, 3.146193],
    [2, 0.3017096, 2.357677],
    [4, 0.448782, 1.882715],
    [5, 0.4932394, 1.77225],
    [10, 0.6168168, 1.516221],
  ])('Q = %d: edges', (Q, lower, upper) => {
    expect(exponentialEdges(1 / Q).lower).toBeCloseTo(lower, 6)
    expect(exponentialEdges(1 / Q).upper).toBeCloseTo(upper, 6)
  })

  it.each([1e-14, 1e-9, 1e-3, 0.5, 5, 80, 400])(
    'load %d: the edges are the roots of λ − ln λ = 1 + load',
    (load) => {
      const { lower, upper } = exponentialEdges(load)
      expect(lower).toBeLessThan(1)
      expect(upper).toBeGreaterThan(1)
      const miss = (x: number): number => x - 1 - Math.log1p(x - 1) - load
      expect(Math.abs(miss(upper)) / load).toBeLessThan(1e-6)
      if (lower > 1e-3) expect(Math.abs(miss(lower)) / load).toBeLessThan(1e-6)
      else expect(lower - Math.log(lower) - 1 - load).toBeCloseTo(0, 9)
    },
  )

  it('no memory at all leaves a single point', () => {
    expect(exponentialEdges(0)).toEqual({ lower: 1, upper: 1 })
  })

  it.each([0.05, 0.2, 1, 3])(
    'load %d: mass 1, mean 1, second moment 1 + 1/(2Q), distribution function',
    (load) => {
      const { lower, upper } = exponentialEdges(load)
      const density = (x: number): number => exponentialDensity(x, load)
      expect(integral(density, lower, upper)).toBeCloseTo(1, 6)
      expect(integral((x) => x * density(x), lower, upper)).toBeCloseTo(1, 6)
      expect(integral((x) => x * x * density(x), lower, upper)).toBeCloseTo(1 + load / 2, 6)
      const law = exponentialLaw(load)
      for (const part of [0.01, 0.1, 0.3, 0.6, 0.95]) {
        const x = lower + part * (upper - lower)
        expect(law.cdf(x)).toBeCloseTo(integral(density, lower, x, 20_000), 6)
      }
      expect(law.cdf(lower)).toBe(0)
      expect(law.cdf(upper)).toBe(1)
    },
  )

  it('is what simulated windows show: edges and distribution at N = 200, half-life 100', () => {
    const { weights, effective } = memoryWeights(100)
    const load = 400 / effective
    const { lower, upper } = exponentialEdges(load)
    const law = exponentialLaw(load)
    const { values } = spectrumOf(normalSignals(new Random(4), 200, weights.length), { weights, known: true })
    expect(Math.abs(values[0]! / upper - 1)).toBeLessThan(0.05)
    expect(Math.abs(values[199]! / lower - 1)).toBeLessThan(0.1)
    values.forEach((x, k) => {
      expect(Math.abs(law.cdf(x) - (199.5 - k) / 200)).toBeLessThan(0.02)
    })
  })
})

describe('Stieltjes transform of a law beyond its edge', () => {
  const laws: [string, BulkLaw, (x: number) => number][] = [
    ['Marchenko–Pastur, q = .4', marchenkoPasturLaw(0.4), (x) => marchenkoPasturDensity(x, 0.4)],
    ['exponential memory, load .8', exponentialLaw(0.8), (x) => exponentialDensity(x, 0.8)],
  ]
  it.each(laws)('%s: is the integral of the density over λ − x', (_, { edges, stieltjes }, density) => {
    for (const x of [edges.upper * 1.05, edges.upper * 2, 50]) {
      const expected = integral((y) => density(y) / (y - x), edges.lower, edges.upper)
      expect(stieltjes(x) / expected).toBeCloseTo(1, 6)
    }
    expect(stieltjes(edges.upper * 1.0001) / stieltjes(edges.upper)).toBeCloseTo(1, 1)
  })
})

describe('the semicircle (Wigner 1955)', () => {
  it('has the Catalan numbers as even moments', () => {
    expect([0, 2, 4, 6, 8, 10].map(semicircleMoment)).toEqual([1, 1, 2, 5, 14, 42])
    expect(semicircleMoment(12)).toBe(132)
    expect(semicircleMoment(3)).toBe(0)
    for (const k of [0, 1, 2, 4, 6]) {
      expect(integral((x) => x ** k * semicircleDensity(x), -2, 2)).toBeCloseTo(semicircleMoment(k), 5)
    }
  })

  it('its distribution function is the integral of the density', () => {
    for (const x of [-1.9, -0.4, 0, 1.3])
      expect(semicircleCdf(x)).toBeCloseTo(integral(semicircleDensity, -2, x), 6)
    expect([semicircleCdf(-3), semicircleCdf(3)]).toEqual([0, 1])
  })

  it('describes √(T/2N)·(C_a − C_b) of two disjoint windows with N ≪ T', () => {
    const [n, frames, runs] = [40, 2000, 8]
    const random = new Random(6)
    const moments = [0, 0, 0, 0, 0]
    for (let run = 0; run < runs; run++) {
      const [a, b] = [normalSignals(random, n, frames).values, normalSignals(random, n, frames).values]
      const matrix = new Float64Array(n * n)
      for (let i = 0; i < n; i++) {
        for (let j = 0; j <= i; j++) {
          let sum = 0
          for (let t = 0; t < frames; t++) {
            sum += a[i * frames + t]! * a[j * frames + t]! - b[i * frames + t]! * b[j * frames + t]!
          }
          matrix[i * n + j] = (Math.sqrt(frames / (2 * n)) * sum) / frames
        }
      }
      for (const x of new PlainSolver().solve(matrix, n, 0).values) {
        for (let k = 1; k <= 4; k++) moments[k] = moments[k]! + x ** k / (n * runs)
      }
    }
    // the diagonal of a real matrix varies twice as much, so that moments come too high by order 1/N
    expect(Math.abs(moments[2]! - semicircleMoment(2))).toBeLessThan(0.08)
    expect(Math.abs(moments[4]! - semicircleMoment(4))).toBeLessThan(0.3)
    for (const k of [1, 3]) expect(Math.abs(moments[k]!)).toBeLessThan(0.1)
  })
})

describe('Wachter edges (Wachter 1978)', () => {
  it('are those of Marchenko & Pastur when the reference is exact, and need a reference longer than N', () => {
    const { lower, upper } = wachterEdges(0.3, 0)
    expect(lower).toBeCloseTo(marchenkoPasturEdges(0.3).lower, 14)
    expect(upper).toBeCloseTo(marchenkoPasturEdges(0.3).upper, 14)
    expect(() => wachterEdges(0.3, 1)).toThrow(RangeError)
  })

  it('bound the simulated change spectrum: N = 40, T = 120, T0 = 200', () => {
    const random = new Random(9)
    const largest: number[] = []
    const smallest: number[] = []
    for (let run = 0; run < 20; run++) {
      const values = changeSpectrum(random, 40, 120, 200)
      largest.push(values[0]!)
      smallest.push(values[39]!)
    }
    const { lower, upper } = wachterEdges(40 / 120, 40 / 200)
    expect(meanOf(largest) / upper).toBeGreaterThan(0.85)
    expect(meanOf(largest) / upper).toBeLessThan(1.02)
    expect(meanOf(smallest) / lower).toBeGreaterThan(0.98)
    expect(meanOf(smallest) / lower).toBeLessThan(1.25)
  })
})

/** Eigenvalues of C0⁻¹C: those of C in the coordinates of the Cholesky factor of C0. */
function changeSpectrum(random: Random, n: number, frames: number, referenceFrames: number): Float64Array {
  const reference = normalSignals(random, n, referenceFrames)
  const factor = Array.from({ length: n }, () => new Float64Array(n))
  for (let i = 0; i < n; i++) {
    for (let j = 0; j <= i; j++) {
      let sum = 0
      for (let t = 0; t < referenceFrames; t++) {
        sum += reference.values[i * referenceFrames + t]! * reference.values[j * referenceFrames + t]!
      }
      sum /= referenceFrames
      for (let k = 0; k < j; k++) sum -= factor[i]![k]! * factor[j]![k]!
      factor[i]![j] = i === j ? Math.sqrt(sum) : sum / factor[j]![j]!
    }
  }
  const present = normalSignals(random, n, frames)
  for (let t = 0; t < frames; t++) {
    for (let i = 0; i < n; i++) {
      let x = present.values[i * frames + t]!
      for (let k = 0; k < i; k++) x -= factor[i]![k]! * present.values[k * frames + t]!
      present.values[i * frames + t] = x / factor[i]![i]!
    }
  }
  return spectrumOf(present, { known: true }).values
}

describe('effective frames under memory (Bartlett 1935)', () => {
  it('are T(1 − r²)/(1 + r²); r = .515 on T = 100 brings the edge of 12 signals to 2.116 (table of check values)', () => {
    expect(effectiveFrames(100, 0)).toBe(100)
    expect(effectiveFrames(100, 0.5)).toBeCloseTo(60, 12)
    expect(effectiveFrames(100, -0.5)).toBeCloseTo(60, 12)
    expect(marchenkoPasturEdges(12 / effectiveFrames(100, 0.515)).upper).toBeCloseTo(2.116, 3)
    expect(marchenkoPasturEdges(12 / 100).upper).toBeCloseTo(1.8128, 4)
    expect(() => effectiveFrames(100, 1)).toThrow(RangeError)
  })

  it('give the variance of the correlation of two AR(1) signals: 1/T_eff (simulated, r = .6, T = 200)', () => {
    const random = new Random(12)
    const [r, frames, runs] = [0.6, 200, 3000]
    let squares = 0
    for (let run = 0; run < runs; run++) {
      const pair = normalSignals(random, 2, frames + 30)
      const ar = { n: 2, frames, values: new Float64Array(2 * frames) }
      for (let i = 0; i < 2; i++) {
        let y = 0
        for (let t = 0; t < frames + 30; t++) {
          y = r * y + Math.sqrt(1 - r * r) * pair.values[i * (frames + 30) + t]!
          if (t >= 30) ar.values[i * frames + t - 30] = y
        }
      }
      squares += (spectrumOf(ar).values[0]! - 1) ** 2
    }
    const found = runs / squares
    // a variance from 3,000 draws is right to 2·√(2/3000) = 5 %, and the formula to order 1/T
    expect(Math.abs(found / effectiveFrames(frames, r) - 1)).toBeLessThan(0.08)
  })
})
