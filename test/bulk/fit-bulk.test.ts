import { describe, expect, it } from 'vitest'
import { exponentialEdges } from '../../src/bulk/exponential-memory.ts'
import { BulkFitter } from '../../src/bulk/fit-bulk.ts'
import { fitLimit, poorFit } from '../../src/bulk/fit-limit.ts'
import { marchenkoPasturEdges } from '../../src/bulk/marchenko-pastur.ts'
import { boxcarNoise } from '../../src/bulk/noise-model.ts'
import { noiseVariance } from '../../src/bulk/noise-variance.ts'
import type { Spectrum } from '../../src/spectrum/spectrum.ts'
import { Random } from '../support/random.ts'
import { fourDeviations, meanOf, memoryWeights, normalSignals, type Signals, spectrumOf } from './noise.ts'

const boxcar = new BulkFitter({ level: 0.01, decay: null, scale: 'correlation' })
const ofValues = (...values: number[]): Spectrum => ({
  n: values.length,
  values: Float64Array.from(values),
  modes: 0,
  vectors: new Float64Array(0),
  age: 0,
  bound: 0,
})

/** Adds a common mode of variance share `share` to the first `sharing` signals. */
function withMode(random: Random, signals: Signals, share: number, sharing = signals.n): Signals {
  const { n, frames, values } = signals
  for (let t = 0; t < frames; t++) {
    const common = random.normal()
    for (let i = 0; i < Math.min(sharing, n); i++) {
      values[i * frames + t] = Math.sqrt(1 - share) * values[i * frames + t]! + Math.sqrt(share) * common
    }
  }
  return signals
}

describe('fit of the bulk', () => {
  it('finds one common mode with the number of its signals, and the noise variance beside it', () => {
    const random = new Random(51)
    const spectrum = spectrumOf(withMode(random, normalSignals(random, 50, 300), 0.4), { modes: 2 })
    const bulk = boxcar.fit(spectrum, 300)
    expect(bulk.escapes).toHaveLength(1)
    expect(bulk.escapes[0]!.value).toBe(spectrum.values[0])
    expect(bulk.escapes[0]!.signals).toBeGreaterThan(40)
    expect(bulk.escapes[0]!.signals).toBeLessThanOrEqual(50)
    expect(Math.abs(bulk.variance - 0.6)).toBeLessThan(0.07)
    expect(bulk.q).toBeCloseTo(49 / 300, 12)
    expect(bulk.model).toBe('marchenko-pastur')
    expect(bulk.level).toBe(0.01)
  })

  it('tells a mode of five signals from one of all', () => {
    const random = new Random(52)
    const signals = withMode(random, withMode(random, normalSignals(random, 40, 400), 0.3), 0.7, 5)
    const { escapes } = boxcar.fit(spectrumOf(signals, { modes: 3 }), 400)
    expect(escapes).toHaveLength(2)
    const [few, many] = escapes.map(({ signals: count }) => count).sort((a, b) => a - b)
    expect(few).toBeGreaterThan(4)
    expect(few).toBeLessThan(7)
    expect(many).toBeGreaterThan(25)
  })

  it('gives 0 signals for an escape whose vector the spectrum does not hold', () => {
    expect(boxcar.fit(ofValues(9, 0.2, 0.2, 0.2, 0.2, 0.2), 100).escapes[0]).toEqual({ value: 9, signals: 0 })
  })

  it('has edges of the law for the p eigenvalues left, times the noise variance', () => {
    const random = new Random(53)
    const spectrum = spectrumOf(withMode(random, normalSignals(random, 30, 100), 0.5))
    const bulk = boxcar.fit(spectrum, 100)
    const edges = marchenkoPasturEdges(29 / 100, bulk.variance)
    expect([bulk.lower, bulk.upper]).toEqual([
      expect.closeTo(edges.lower, 12),
      expect.closeTo(edges.upper, 12),
    ])
    expect(bulk.limit).toBeGreaterThan(bulk.upper)
    for (const { value } of bulk.escapes) expect(value).toBeGreaterThan(bulk.limit)
    expect(spectrum.values[bulk.escapes.length]).toBeLessThanOrEqual(bulk.limit)
  })

  it('does not care for the unit of a covariance', () => {
    const random = new Random(54)
    const spectrum = spectrumOf(withMode(random, normalSignals(random, 20, 80), 0.4), {
      known: true,
      modes: 2,
    })
    const fitter = new BulkFitter({ level: 0.01, decay: null })
    const bulk = fitter.fit(spectrum, 80)
    const scaled = fitter.fit({ ...spectrum, values: spectrum.values.map((x) => x * 1024) }, 80)
    expect(scaled.escapes.length).toBe(bulk.escapes.length)
    for (const key of ['lower', 'upper', 'limit', 'variance'] as const) {
      expect(scaled[key] / bulk[key]).toBeCloseTo(1024, 8)
    }
    expect(scaled.fit).toBeCloseTo(bulk.fit, 10)
    expect(scaled.momentQ).toBeCloseTo(bulk.momentQ, 10)
  })

  it('under an exponential memory has its edges, with N(1 − a) = 2N/T_eff', () => {
    const random = new Random(55)
    const { weights, decay, effective } = memoryWeights(60)
    const spectrum = spectrumOf(withMode(random, normalSignals(random, 25, weights.length), 0.4), { weights })
    const bulk = new BulkFitter({ level: 0.01, decay, scale: 'correlation' }).fit(spectrum, effective)
    expect(bulk.model).toBe('exponential')
    expect(bulk.escapes).toHaveLength(1)
    expect(bulk.upper).toBeCloseTo(exponentialEdges(48 / effective, bulk.variance).upper, 12)
    expect(Math.abs(24 * (1 - decay) - 48 / effective) / (48 / effective)).toBeLessThan(0.01)
    expect(poorFit(bulk, 25)).toBe(false)
  })

  it.each([
    ['boxcar', 30, null],
    ['exponential', 25, 30],
  ] as const)('%s: the moments of the bulk give q back', (_, n, halfLife) => {
    const random = new Random(56)
    const memory = halfLife === null ? null : memoryWeights(halfLife)
    const frames = memory?.weights.length ?? 100
    const fitter = new BulkFitter({ level: 0.001, decay: memory?.decay ?? null })
    const effective = memory?.effective ?? frames
    const found = Array.from({ length: 60 }, () => {
      const reading = memory === null ? { known: true } : { known: true, weights: memory.weights }
      return fitter.fit(spectrumOf(normalSignals(random, n, frames), reading), effective)
    })
    expect(Math.abs(meanOf(found.map(({ momentQ }) => momentQ)) / (n / effective) - 1)).toBeLessThan(0.05)
  })

  it('calls noise beside a strong common mode an escape no more often than the level', () => {
    const random = new Random(57)
    const fitter = new BulkFitter({ level: 0.05, decay: null, scale: 'correlation' })
    const runs = 500
    let more = 0
    for (let run = 0; run < runs; run++) {
      const { escapes } = fitter.fit(spectrumOf(withMode(random, normalSignals(random, 40, 80), 0.3)), 80)
      expect(escapes.length).toBeGreaterThanOrEqual(1)
      if (escapes.length > 1) more++
    }
    expect(more / runs).toBeLessThan(0.05 + fourDeviations(0.05, runs))
  })

  it('the noise variance counts what an escape drew up; leaving the whole of it out is too little', () => {
    const random = new Random(58)
    const [n, frames] = [40, 80]
    const law = boxcarNoise.law(n - 1, frames)
    const found: number[] = []
    const naive: number[] = []
    for (let run = 0; run < 150; run++) {
      const signals = normalSignals(random, n, frames)
      for (let t = 0; t < frames; t++) signals.values[t] = signals.values[t]! * Math.sqrt(8)
      const { values } = spectrumOf(signals, { known: true })
      const trace = values.reduce((sum, x) => sum + x, 0)
      found.push(noiseVariance(values, 1, trace, law))
      naive.push((trace - values[0]!) / (n - 1))
    }
    expect(Math.abs(meanOf(found) - 1)).toBeLessThan(0.006)
    expect(meanOf(naive)).toBeLessThan(0.99)
  })
})

describe('the distance of the bulk from its law', () => {
  it.each([
    [10, 100],
    [40, 30],
    [60, 200],
  ])('never reaches its limit of 4/n on normal noise: N = %i, T = %i', (n, frames) => {
    const random = new Random(61)
    for (let run = 0; run < 60; run++) {
      const bulk = boxcar.fit(spectrumOf(normalSignals(random, n, frames)), frames)
      expect(bulk.fit).toBeLessThan(fitLimit(n))
      expect(bulk.fit).toBeGreaterThan(0.2 / n)
    }
  })

  it('passes it when memory is ignored (AR(1), r = .6), and comes down when T_eff counts it', () => {
    const random = new Random(62)
    const [n, frames, r] = [60, 200, 0.6]
    for (let run = 0; run < 10; run++) {
      const signals = normalSignals(random, n, frames)
      for (let i = 0; i < n; i++) {
        for (let t = 1; t < frames; t++) {
          const k = i * frames + t
          signals.values[k] = r * signals.values[k - 1]! + Math.sqrt(1 - r * r) * signals.values[k]!
        }
      }
      const spectrum = spectrumOf(signals)
      const ignored = boxcar.fit(spectrum, frames)
      expect(poorFit(ignored, n)).toBe(true)
      const honest = boxcar.fit(spectrum, (frames * (1 - r * r)) / (1 + r * r))
      expect(honest.fit).toBeLessThan(ignored.fit)
    }
  })

  it('sees the mass at 0 of more signals than frames', () => {
    const random = new Random(63)
    const spectrum = spectrumOf(normalSignals(random, 80, 40))
    expect(boxcar.fit(spectrum, 40).fit).toBeLessThan(fitLimit(80))
    expect(boxcar.fit(spectrum, 200).fit).toBeGreaterThan(0.3)
  })
})

describe('odd spectra', () => {
  const finite = (spectrum: Spectrum, effective = 50) => {
    const bulk = boxcar.fit(spectrum, effective)
    for (const [key, value] of Object.entries(bulk)) {
      if (typeof value === 'number') expect([key, Number.isFinite(value)]).toEqual([key, true])
    }
    return bulk
  }

  it('a zero matrix, a single signal and no signal at all give finite figures and no escape', () => {
    for (const spectrum of [ofValues(0, 0, 0), ofValues(1), ofValues()]) {
      expect(finite(spectrum).escapes).toEqual([])
    }
  })

  it('the identity has no escape; a rank-one matrix has one', () => {
    expect(finite(ofValues(...new Array<number>(20).fill(1))).escapes).toEqual([])
    const bulk = finite(ofValues(20, ...new Array<number>(19).fill(1e-16)))
    expect(bulk.escapes).toHaveLength(1)
    expect(bulk.variance).toBeLessThan(1e-12)
  })

  it('ten pairs of equal signals are ten escapes', () => {
    const values = [...new Array<number>(10).fill(2), ...new Array<number>(10).fill(-1e-17)]
    expect(finite(ofValues(...values), 400).escapes).toHaveLength(10)
  })

  it('a window of hardly any frames gives finite figures', () => {
    for (const effective of [1, 1.5, 2, 3]) finite(ofValues(3, 1, 0, 0), effective)
  })

  it('a level that is no probability is refused', () => {
    for (const level of [0, 1, Number.NaN]) {
      expect(() => new BulkFitter({ level, decay: null })).toThrow(RangeError)
    }
  })
})
