import { describe, expect, it } from 'vitest'
import { BulkFitter } from '../../src/bulk/fit-bulk.ts'
import { type CommonModes, type FrameTable, ResampledEdge } from '../../src/bulk/resampled-edge.ts'
import { fastestSolver } from '../../src/spectrum/fastest-solver.ts'
import { testWithOpenData } from '../support/open-data.ts'
import { Random } from '../support/random.ts'
import { fourDeviations, meanOf, spectrumOf } from './noise.ts'

const solver = fastestSolver()

/** AR(1) signals with coefficient r, as rows of frames. */
function arTable(random: Random, n: number, frames: number, r: number): FrameTable {
  const values = new Float64Array(n * frames)
  for (let i = 0; i < n; i++) {
    let y = random.normal()
    for (let t = 0; t < frames; t++) {
      y = r * y + Math.sqrt(1 - r * r) * random.normal()
      values[t * n + i] = y
    }
  }
  return { n, frames, values }
}

const correlationOf = ({ n, frames, values }: FrameTable, modes = 0) =>
  spectrumOf(
    {
      n,
      frames,
      values: Float64Array.from(
        { length: n * frames },
        (_, k) => values[(k % frames) * n + Math.floor(k / frames)]!,
      ),
    },
    { modes },
  )

function edgeOf(
  table: FrameTable,
  draws: number,
  level: number,
  seed = 1,
  decay: number | null = null,
  common?: CommonModes,
) {
  const edge = new ResampledEdge(solver, { level, seed, decay })
  for (let k = 0; k < draws; k++) edge.draw(table, common)
  return edge
}

describe('resampled edge (circular shifts, Politis & Romano 1994)', () => {
  it('keeps the level under memory that the law does not know: AR(1), r = .5', () => {
    const random = new Random(71)
    const runs = 150
    const level = 0.1
    const law = new BulkFitter({ level, decay: null, scale: 'correlation' })
    let beyond = 0
    let beyondLaw = 0
    for (let run = 0; run < runs; run++) {
      const table = arTable(random, 12, 100, 0.5)
      const spectrum = correlationOf(table)
      if (spectrum.values[0]! > edgeOf(table, 59, level, run).limit!.limit) beyond++
      if (law.fit(spectrum, 100).escapes.length > 0) beyondLaw++
    }
    expect(Math.abs(beyond / runs - level)).toBeLessThan(fourDeviations(level, runs))
    expect(beyondLaw / runs).toBeGreaterThan(0.5)
  })

  it('loses what signals share: a common mode, projected off, does not raise the limit', () => {
    const random = new Random(72)
    const table = arTable(random, 12, 200, 0)
    const alone = edgeOf(table, 60, 0.05).limit!
    for (let t = 0; t < 200; t++) {
      const common = 1.5 * random.normal()
      for (let i = 0; i < 12; i++) table.values[t * 12 + i] = table.values[t * 12 + i]! + common
    }
    const { values, vectors } = correlationOf(table, 1)
    const shared = edgeOf(table, 60, 0.05, 1, null, { count: 1, vectors }).limit!
    const leftIn = edgeOf(table, 60, 0.05).limit!
    expect(values[0]).toBeGreaterThan(6)
    expect(Math.abs(shared.limit / alone.limit - 1)).toBeLessThan(0.06)
    expect(leftIn.limit / alone.limit).toBeGreaterThan(1.1)
  })

  it('on independent normal noise agrees with the law: limit, edges and mean spectrum', () => {
    const random = new Random(73)
    const table = arTable(random, 30, 100, 0)
    const { lower, upper, limit, spectrum } = edgeOf(table, 300, 0.05).limit!
    const bulk = new BulkFitter({ level: 0.05, decay: null, scale: 'correlation' }).fit(
      correlationOf(table),
      100,
    )
    expect(Math.abs(limit / bulk.limit - 1)).toBeLessThan(0.03)
    expect(Math.abs(upper / bulk.upper - 1)).toBeLessThan(0.1)
    expect(Math.abs(lower / bulk.lower - 1)).toBeLessThan(0.25)
    expect(spectrum.reduce((sum, x) => sum + x, 0)).toBeCloseTo(30, 9)
  })

  it('follows the weights of an exponential memory', () => {
    const random = new Random(74)
    const table = arTable(random, 20, 400, 0)
    const decay = 2 ** (-1 / 30)
    const flat = edgeOf(table, 40, 0.05).limit!
    const fading = edgeOf(table, 40, 0.05, 1, decay).limit!
    const expected = new BulkFitter({ level: 0.05, decay }).fit(
      correlationOf(table),
      (1 + decay) / (1 - decay),
    )
    expect(fading.upper).toBeGreaterThan(1.3 * flat.upper)
    expect(Math.abs(fading.upper / expected.upper - 1)).toBeLessThan(0.2)
  })

  it('a rare level is reached by the law of the draws, above the largest of them', () => {
    const table = arTable(new Random(75), 20, 100, 0.3)
    const common = edgeOf(table, 100, 0.05).limit!.limit
    const rare = edgeOf(table, 100, 1e-4).limit!.limit
    const rarer = edgeOf(table, 100, 1e-6).limit!.limit
    expect(rare).toBeGreaterThan(common)
    expect(rarer).toBeGreaterThan(rare)
  })

  it('takes the place of the law in the fit', () => {
    const random = new Random(76)
    const table = arTable(random, 40, 120, 0.6)
    const spectrum = correlationOf(table)
    const fitter = new BulkFitter({ level: 0.05, decay: null, scale: 'correlation' })
    const byLaw = fitter.fit(spectrum, 120)
    const resampled = fitter.fit(spectrum, 120, edgeOf(table, 60, 0.05).limit)
    expect(byLaw.escapes.length).toBeGreaterThan(3)
    expect(resampled.model).toBe('resampled')
    expect(resampled.escapes.length).toBeLessThan(2)
    expect(resampled.upper).toBeGreaterThan(byLaw.upper)
    expect(resampled.fit).toBeLessThan(byLaw.fit / 2)
  })

  it('is the same for the same seed, and goes on bit for bit from a snapshot', () => {
    const table = arTable(new Random(77), 8, 60, 0.2)
    expect(edgeOf(table, 30, 0.05, 5).limit).toEqual(edgeOf(table, 30, 0.05, 5).limit)
    expect(edgeOf(table, 30, 0.05, 5).limit).not.toEqual(edgeOf(table, 30, 0.05, 6).limit)
    const whole = edgeOf(table, 30, 0.05, 5)
    const half = edgeOf(table, 15, 0.05, 5)
    const resumed = new ResampledEdge(solver, { level: 0.05, seed: 99, decay: null })
    resumed.restore(structuredClone(half.snapshot()))
    for (let k = 0; k < 15; k++) resumed.draw(table)
    expect(resumed.limit).toEqual(whole.limit)
  })

  it('has no limit below 20 draws, starts afresh when n changes, keeps at most 400, and bears constant signals', () => {
    const table = arTable(new Random(78), 5, 40, 0)
    const edge = edgeOf(table, 19, 0.05)
    expect(edge.limit).toBeNull()
    edge.draw(table)
    expect(edge.limit).not.toBeNull()
    edge.draw(arTable(new Random(79), 6, 40, 0))
    expect(edge.draws).toBe(1)
    for (let t = 0; t < 40; t++) table.values[t * 5] = 3
    const constant = edgeOf(table, 420, 0.05)
    expect(constant.draws).toBe(400)
    expect(Number.isFinite(constant.limit!.limit)).toBe(true)
    expect(() => new ResampledEdge(solver, { level: 0, seed: 1, decay: null })).toThrow(RangeError)
  })

  testWithOpenData(
    'wind',
    'wind: memory alone reaches 2.09 at T = 100 in 5 % of draws; the edge in the window is beyond that of independent frames',
    (wind) => {
      // table of check values (numpy, 400 draws): 95 % quantile 2.09; independent edge 1.8128, by T_eff 2.116
      const n = wind.signals.length
      const days = wind.dates.length
      const clean = withoutYear(wind.values, n, days)
      const random = new Random(80)
      const largest = Array.from({ length: 1000 }, () => {
        const start = Int32Array.from({ length: n }, () => random.below(days))
        const values = Float64Array.from({ length: n * 100 }, (_, k) => {
          const i = k % n
          return clean[((start[i]! + (k - i) / n) % days) * n + i]!
        })
        return correlationOf({ n, frames: 100, values }).values[0]!
      }).sort((a, b) => a - b)
      expect(Math.abs(largest[950]! - 2.09)).toBeLessThan(0.06)
      const limits = Array.from({ length: 60 }, (_, run) => {
        const start = random.below(days - 100)
        const table = { n, frames: 100, values: clean.slice(start * n, (start + 100) * n) }
        const common = { count: 1, vectors: correlationOf(table, 1).vectors }
        return edgeOf(table, 60, 0.05, run, null, common).limit!.limit
      })
      expect(meanOf(limits)).toBeGreaterThan(1.8128)
      expect(meanOf(limits)).toBeLessThan(2.116)
    },
  )
})

/** Square root, mean and two annual harmonics removed by least squares, signal by signal. */
function withoutYear(values: Float64Array, n: number, days: number): Float64Array {
  const out = Float64Array.from(values, Math.sqrt)
  const year = 365.25
  for (let i = 0; i < n; i++) {
    for (const wave of [
      () => 1,
      ...[1, 2].flatMap((k) =>
        [Math.cos, Math.sin].map((f) => (t: number) => f((2 * Math.PI * k * t) / year)),
      ),
    ]) {
      let inner = 0
      let norm = 0
      for (let t = 0; t < days; t++) {
        inner += out[t * n + i]! * wave(t)
        norm += wave(t) ** 2
      }
      for (let t = 0; t < days; t++) out[t * n + i] = out[t * n + i]! - (inner / norm) * wave(t)
    }
  }
  return out
}
