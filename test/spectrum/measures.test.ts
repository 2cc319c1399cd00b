import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { participationRatio } from '../../src/bulk/participation.ts'
import { effectiveRank } from '../../src/spectrum/effective-rank.ts'
import { frobeniusCeiling } from '../../src/spectrum/frobenius.ts'
import { meanCorrelation } from '../../src/spectrum/mean-correlation.ts'
import { PlainSolver } from '../../src/spectrum/plain-solver.ts'
import { rotationShare } from '../../src/spectrum/rotation-share.ts'
import { absorptionRatio, leadingShare, traceOf } from '../../src/spectrum/shares.ts'
import { wasserstein2 } from '../../src/spectrum/wasserstein.ts'

const solver = new PlainSolver()
const identity = (n: number): Float64Array =>
  Float64Array.from({ length: n * n }, (_, k) => (k % (n + 1) === 0 ? 1 : 0))
const equicorrelated = (n: number, rho: number): Float64Array => identity(n).map((x) => (x === 1 ? 1 : rho))

describe('the worked 4 × 4 correlation (table of check values, recomputed there by an independent program)', () => {
  const matrix = Float64Array.of(1, 0.8, 0.4, 0.2, 0.8, 1, 0.5, 0.3, 0.4, 0.5, 1, 0.6, 0.2, 0.3, 0.6, 1)
  const { values, vectors } = solver.solve(matrix, 4, 4)

  it('has its eigenvalues', () => {
    const expected = [2.420379726, 1.026733915, 0.362285442, 0.190600917]
    expected.forEach((value, k) => {
      expect(values[k]).toBeCloseTo(value, 9)
    })
  })

  it('has its absorption ratios, and by default that of a fifth of the modes (Kritzman et al. 2011)', () => {
    expect(absorptionRatio(values, 1)).toBeCloseTo(0.6050949, 7)
    expect(absorptionRatio(values, 2)).toBeCloseTo(0.8617784, 7)
    expect(absorptionRatio(values)).toBe(absorptionRatio(values, 1))
    expect(leadingShare(values)).toBe(absorptionRatio(values, 1))
    expect(absorptionRatio(new Float64Array(30).fill(1))).toBeCloseTo(0.2, 15)
  })

  it('has its effective rank (Roy & Vetterli 2007)', () => {
    expect(effectiveRank(values)).toBeCloseTo(2.761039, 7)
  })

  it('has the participation of its leading mode', () => {
    expect(participationRatio(vectors, 0, 4)).toBeCloseTo(1 / 0.2610507, 6)
  })

  it('is as far from the identity by W2 as by its ceiling', () => {
    expect(wasserstein2(values, Float64Array.of(1, 1, 1, 1))).toBeCloseTo(0.8774964, 7)
    expect(frobeniusCeiling(matrix, identity(4), 4)).toBeCloseTo(0.8774964, 7)
  })

  it('has the mean of its six correlations', () => {
    expect(meanCorrelation(matrix, 4)).toBeCloseTo(2.8 / 6, 15)
  })
})

describe('W2 and its ceiling', () => {
  it('meet in the tight case: equal correlation, N = 30, ρ .2 → .5 (closed form)', () => {
    const before = equicorrelated(30, 0.2)
    const after = equicorrelated(30, 0.5)
    const [a, b] = [solver.solve(before, 30, 0).values, solver.solve(after, 30, 0).values]
    expect(a[0]).toBeCloseTo(6.8, 12)
    expect(b[0]).toBeCloseTo(15.5, 12)
    expect(wasserstein2(a, b)).toBeCloseTo(0.3 * Math.sqrt(29), 12)
    expect(frobeniusCeiling(before, after, 30)).toBeCloseTo(1.6155494, 7)
    expect(rotationShare(wasserstein2(a, b), frobeniusCeiling(before, after, 30))).toBeCloseTo(0, 12)
  })

  it('the ceiling reads lower triangles', () => {
    const upper = Float64Array.of(1, Number.NaN, 0.3, 2)
    expect(frobeniusCeiling(upper, identity(2), 2)).toBeCloseTo(Math.sqrt((2 * 0.09 + 1) / 2), 15)
  })

  it('W2 of spectra of different length is that of both repeated to a common length (property)', () => {
    const spectrum = fc
      .array(fc.double({ min: 0, max: 5, noNaN: true }), { minLength: 1, maxLength: 7 })
      .map((values) => Float64Array.from(values).sort().reverse())
    const repeated = (values: Float64Array, times: number): Float64Array =>
      Float64Array.from({ length: values.length * times }, (_, k) => values[Math.floor(k / times)]!)
    fc.assert(
      fc.property(spectrum, spectrum, (a, b) => {
        const expected = wasserstein2(repeated(a, b.length), repeated(b, a.length))
        expect(Math.abs(wasserstein2(a, b) - expected)).toBeLessThan(1e-12)
        expect(wasserstein2(b, a)).toBeCloseTo(expected, 12)
      }),
      { seed: 3 },
    )
  })

  it('two empty spectra are 0 apart; one alone has no distance', () => {
    expect(wasserstein2(new Float64Array(0), new Float64Array(0))).toBe(0)
    expect(() => wasserstein2(new Float64Array(0), Float64Array.of(1))).toThrow(RangeError)
  })

  it('the rotation share is 1 when only partners changed, 0 when nothing did, and stays in [0, 1]', () => {
    const paired = identity(4)
    paired[4] = paired[1] = 0.6
    const moved = identity(4)
    moved[14] = moved[11] = 0.6
    const [a, b] = [solver.solve(paired, 4, 0).values, solver.solve(moved, 4, 0).values]
    expect(rotationShare(wasserstein2(a, b), frobeniusCeiling(paired, moved, 4))).toBeCloseTo(1, 15)
    expect(rotationShare(0, 0)).toBe(0)
    expect(rotationShare(1 + 1e-15, 1)).toBe(0)
  })
})

describe('measures of shape', () => {
  it('participation is the number of equal entries, 1 for a single one, whatever the length of the vector', () => {
    expect(participationRatio(Float64Array.of(3, 3, 3, 0, 0))).toBeCloseTo(3, 14)
    expect(participationRatio(Float64Array.of(0, -1e-3, 0))).toBeCloseTo(1, 14)
    expect(participationRatio(new Float64Array(3))).toBe(0)
  })

  it('effective rank is the number of equal values; zeros and rounding below zero do not count', () => {
    expect(effectiveRank(Float64Array.of(2, 2, 2, 0, -1e-17))).toBeCloseTo(3, 14)
    expect(effectiveRank(new Float64Array(3))).toBe(0)
  })

  it('a spectrum of zeros has shares of 0, never NaN', () => {
    expect(leadingShare(new Float64Array(4))).toBe(0)
    expect(absorptionRatio(new Float64Array(0))).toBe(0)
    expect(traceOf(Float64Array.of(2, 1))).toBe(3)
  })

  it('equal correlation is its own mean; a single signal has none', () => {
    expect(meanCorrelation(equicorrelated(9, 0.37), 9)).toBeCloseTo(0.37, 14)
    expect(meanCorrelation(Float64Array.of(1), 1)).toBe(0)
  })
})
