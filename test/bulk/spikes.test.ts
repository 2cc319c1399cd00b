import { describe, expect, it } from 'vitest'
import { exponentialLaw } from '../../src/bulk/exponential-memory.ts'
import { marchenkoPasturEdges, marchenkoPasturLaw } from '../../src/bulk/marchenko-pastur.ts'
import { populationSpike } from '../../src/bulk/noise-variance.ts'
import { overlapOfSpike, sampleOfSpike, sightLimit, spikeOfSample } from '../../src/bulk/spikes.ts'
import { Random } from '../support/random.ts'
import { meanOf, memoryWeights, normalSignals, spectrumOf } from './noise.ts'

const sources = 'Baik, Ben Arous & Péché 2005; Baik & Silverstein 2006; Paul 2007; table of check values'

/** Normal noise whose first signal has the variance `spike`. */
function spiked(random: Random, n: number, frames: number, spike: number) {
  const signals = normalSignals(random, n, frames)
  for (let t = 0; t < frames; t++) signals.values[t] = signals.values[t]! * Math.sqrt(spike)
  return signals
}

describe(`spikes (${sources})`, () => {
  it.each([
    [3, 0.25, 3.375, 0.8333],
    [5, 0.12, 5.15, 0.96359],
    [3, 0.5, 3.75, 0.7],
  ])('ℓ = %d, γ = %d shows at %d with squared overlap %d, and back', (spike, q, sample, overlap) => {
    expect(sampleOfSpike(spike, q)).toBeCloseTo(sample, 12)
    expect(overlapOfSpike(spike, q)).toBeCloseTo(overlap, 4)
    expect(spikeOfSample(sample, q)).toBeCloseTo(spike, 12)
    const b = sample + 1 - q
    expect(spikeOfSample(sample, q)).toBeCloseTo((b + Math.sqrt(b * b - 4 * sample)) / 2, 14)
  })

  it('below 1 + √γ nothing shows: the sample stays at the edge, the direction is lost', () => {
    expect(sightLimit(0.25)).toBe(1.5)
    expect(sampleOfSpike(1.2, 0.25)).toBe(marchenkoPasturEdges(0.25).upper)
    expect(overlapOfSpike(1.2, 0.25)).toBe(0)
    expect(spikeOfSample(2.25, 0.25)).toBeNull()
    expect(spikeOfSample(0.3, 0.25)).toBeNull()
    expect(sampleOfSpike(1.5 + 1e-9, 0.25)).toBeCloseTo(2.25, 8)
  })

  it.each([
    // the table's simulation: 3.385 ± .010 and .8346 ± .0015 for ℓ 3, γ .25
    [3, 0.25, 50, 150],
    [5, 0.12, 48, 100],
    [3, 0.5, 60, 100],
    [1.2, 0.25, 50, 150],
  ])('ℓ = %d, γ = %d is where simulated windows show it', (spike, q, n, runs) => {
    const random = new Random(41)
    const spectra = Array.from({ length: runs }, () =>
      spectrumOf(spiked(random, n, n / q, spike), { known: true, modes: 1 }),
    )
    const found = meanOf(spectra.map(({ values }) => values[0]!))
    const overlap = meanOf(spectra.map(({ vectors }) => vectors[0]! ** 2))
    if (spike > sightLimit(q)) {
      // λ fluctuates by ℓ√(2(1 − γ/(ℓ−1)²)/T) (Paul 2007); a bias of order 1/N is left
      const deviation = spike * Math.sqrt((2 * q) / n / runs)
      expect(Math.abs(found - sampleOfSpike(spike, q))).toBeLessThan(4 * deviation + 1.5 / n)
      expect(Math.abs(overlap - overlapOfSpike(spike, q))).toBeLessThan(0.02)
    } else {
      expect(Math.abs(found / sampleOfSpike(spike, q) - 1)).toBeLessThan(0.06)
      expect(overlap).toBeLessThan(0.2)
    }
  })

  it('the inverse by the Stieltjes transform is that of the closed form', () => {
    for (const q of [0.12, 0.5, 2]) {
      const law = marchenkoPasturLaw(q)
      for (const spike of [1.1 + Math.sqrt(q), 3, 40]) {
        expect(populationSpike(sampleOfSpike(spike, q), law)).toBeCloseTo(Math.max(spike, sightLimit(q)), 9)
      }
    }
  })

  it('under an exponential memory the inverse finds the simulated spike: ℓ = 4, N = 50, half-life 40', () => {
    const random = new Random(42)
    const { weights, effective } = memoryWeights(40)
    const law = exponentialLaw(100 / effective)
    const found = Array.from({ length: 150 }, () => {
      const { values } = spectrumOf(spiked(random, 50, weights.length, 4), { weights, known: true })
      return populationSpike(values[0]!, law)
    })
    expect(Math.abs(meanOf(found) - 4)).toBeLessThan(4 * 4 * Math.sqrt(2 / effective / 150) + 0.05)
  })
})
