import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { MomentEstimator } from '../../src/window/moment-estimator.ts'
import { batchCorrelation, batchVariance, largestDifference, presentOf, type Row, valuesOf } from './batch.ts'

const value = fc.double({ min: -50, max: 50, noNaN: true }).map((v) => Math.round(v * 64) / 64)
const entry = fc.oneof({ weight: 6, arbitrary: value }, { weight: 1, arbitrary: fc.constant(null) })
const frames = (n: number, most: number): fc.Arbitrary<Row[]> =>
  fc.array(fc.array(entry, { minLength: n, maxLength: n }), { minLength: 3, maxLength: most })
const everySignal = (n: number): Int32Array => Int32Array.from({ length: n }, (_, i) => i)
const n = 4

const forms = [
  { name: 'boxcar', decay: null },
  { name: 'exponential', decay: 2 ** (-1 / 6) },
] as const

const weightsOf = (decay: number | null, count: number): number[] =>
  Array.from({ length: count }, (_, t) => (decay === null ? 1 : (1 - decay) * decay ** (count - 1 - t)))

/** Entries whose two variances are real: near-constant signals amplify rounding without bound. */
function compare(estimator: MomentEstimator, rows: readonly Row[], decay: number | null): void {
  const weights = weightsOf(decay, rows.length)
  const out = new Float64Array(n * n)
  estimator.correlation(out, everySignal(n))
  const batch = batchCorrelation(rows, weights, n)
  for (let i = 0; i < n; i++) {
    const variance = batchVariance(rows, weights, i)
    expect(Math.abs(estimator.variance(i) - variance)).toBeLessThan(1e-8 * (1 + variance))
    for (let j = 0; j < n; j++) {
      if (variance < 1e-3 || batchVariance(rows, weights, j) < 1e-3) continue
      expect(Math.abs(out[i * n + j]! - batch[i * n + j]!)).toBeLessThan(1e-9)
    }
  }
}

describe.each(forms)('moments under a $name weighting', ({ decay }) => {
  it('equal the batch formula at every step, gaps and all', () => {
    fc.assert(
      fc.property(frames(n, 30), (rows) => {
        const estimator = new MomentEstimator(decay)
        rows.forEach((row, t) => {
          estimator.push(valuesOf(row), presentOf(row))
          compare(estimator, rows.slice(0, t + 1), decay)
        })
      }),
      { seed: 11, numRuns: 60 },
    )
  })

  it('drop undoes push', () => {
    fc.assert(
      fc.property(frames(n, 20), fc.array(entry, { minLength: n, maxLength: n }), (rows, extra) => {
        const estimator = new MomentEstimator(decay)
        for (const row of rows) estimator.push(valuesOf(row), presentOf(row))
        estimator.push(valuesOf(extra), presentOf(extra))
        estimator.drop(valuesOf(extra), presentOf(extra))
        compare(estimator, rows, decay)
        expect(estimator.total).toBeCloseTo(
          weightsOf(decay, rows.length).reduce((a, b) => a + b, 0),
          12,
        )
      }),
      { seed: 12, numRuns: 80 },
    )
  })

  it('the order of the signals does not matter', () => {
    fc.assert(
      fc.property(
        frames(n, 20),
        fc.shuffledSubarray([0, 1, 2, 3], { minLength: n, maxLength: n }),
        (rows, order) => {
          const straight = new MomentEstimator(decay)
          const permuted = new MomentEstimator(decay)
          for (const row of rows) {
            const moved = order.map((i) => row[i]!)
            straight.push(valuesOf(row), presentOf(row))
            permuted.push(valuesOf(moved), presentOf(moved))
          }
          const a = new Float64Array(n * n)
          const b = new Float64Array(n * n)
          straight.correlation(a, everySignal(n))
          permuted.correlation(b, everySignal(n))
          for (let i = 0; i < n; i++) {
            for (let j = 0; j < n; j++) {
              expect(Math.abs(b[i * n + j]! - a[order[i]! * n + order[j]!]!)).toBeLessThan(1e-12)
            }
          }
        },
      ),
      { seed: 13, numRuns: 80 },
    )
  })

  it('a roster that grows gives what a wide roster with gaps gives', () => {
    fc.assert(
      fc.property(frames(n, 12), frames(n, 12), (early, late) => {
        const grown = new MomentEstimator(decay)
        for (const row of early) grown.push(valuesOf(row.slice(0, 2)), presentOf(row.slice(0, 2)))
        for (const row of late) grown.push(valuesOf(row), presentOf(row))
        const rows: Row[] = [...early.map((row) => [row[0]!, row[1]!, null, null]), ...late]
        compare(grown, rows, decay)
      }),
      { seed: 14, numRuns: 80 },
    )
  })

  it('moving the pivots changes nothing but rounding', () => {
    fc.assert(
      fc.property(frames(n, 20), (rows) => {
        const estimator = new MomentEstimator(decay)
        rows.forEach((row, t) => {
          estimator.push(valuesOf(row), presentOf(row))
          if (t % 5 === 4) estimator.recentre()
        })
        compare(estimator, rows, decay)
      }),
      { seed: 15, numRuns: 60 },
    )
  })

  it('goes on bit for bit after a snapshot, also into an estimator that held something else', () => {
    fc.assert(
      fc.property(frames(n, 14), frames(n, 14), (before, after) => {
        const a = new MomentEstimator(decay)
        const b = new MomentEstimator(decay)
        b.push(Float64Array.of(1, 2, 3, 4, 5, 6, 7), Uint8Array.of(1, 1, 0, 1, 1, 1, 1))
        for (const row of before) a.push(valuesOf(row), presentOf(row))
        b.restore(structuredClone(a.snapshot()))
        for (const row of after) {
          const wide: Row = [...row, 1.5]
          a.push(valuesOf(wide), presentOf(wide))
          b.push(valuesOf(wide), presentOf(wide))
        }
        const x = new Float64Array(25)
        const y = new Float64Array(25)
        a.correlation(x, everySignal(5))
        b.correlation(y, everySignal(5))
        expect(y).toEqual(x)
      }),
      { seed: 16, numRuns: 60 },
    )
  })
})

describe('the boxcar form', () => {
  it('exchange is a push and a drop', () => {
    fc.assert(
      fc.property(frames(n, 20), fc.array(entry, { minLength: n, maxLength: n }), (rows, extra) => {
        const estimator = new MomentEstimator()
        for (const row of rows) estimator.push(valuesOf(row), presentOf(row))
        estimator.exchange(valuesOf(extra), presentOf(extra), valuesOf(rows[0]!), presentOf(rows[0]!))
        compare(estimator, [...rows.slice(1), extra], null)
      }),
      { seed: 17, numRuns: 80 },
    )
  })

  it('takes a signal that never varies as one without correlation, never as NaN', () => {
    const estimator = new MomentEstimator()
    for (let t = 0; t < 10; t++) estimator.push(Float64Array.of(t % 3, 7.25, 0), Uint8Array.of(1, 1, 0))
    const out = new Float64Array(9)
    estimator.correlation(out, everySignal(3))
    expect([...out]).toEqual([1, 0, 0, 0, 1, 0, 0, 0, 1])
    expect([estimator.variance(1), estimator.variance(2)]).toEqual([0, 0])
  })

  it('gives covariance in fixed scales: own scales give the correlation', () => {
    fc.assert(
      fc.property(frames(n, 20), (rows) => {
        const estimator = new MomentEstimator()
        for (const row of rows) estimator.push(valuesOf(row), presentOf(row))
        const scales = Float64Array.from({ length: n }, (_, i) => Math.sqrt(estimator.variance(i)))
        if (scales.some((s) => s < 0.1)) return
        const own = new Float64Array(n * n)
        const half = new Float64Array(n * n)
        const correlation = new Float64Array(n * n)
        estimator.covariance(own, everySignal(n), scales)
        estimator.covariance(
          half,
          everySignal(n),
          scales.map((s) => s / 2),
        )
        estimator.correlation(correlation, everySignal(n))
        expect(largestDifference(own, correlation)).toBeLessThan(1e-9)
        expect(
          largestDifference(
            half,
            own.map((v) => 4 * v),
          ),
        ).toBeLessThan(1e-8)
      }),
      { seed: 18, numRuns: 80 },
    )
  })
})
