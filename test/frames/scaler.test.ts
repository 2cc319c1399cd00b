import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { Scaler, type ScalerOptions } from '../../src/frames/scaler.ts'
import { medianOf, SlidingMedian } from '../../src/frames/sliding-median.ts'
import { Random } from '../support/random.ts'

const options: ScalerOptions = { span: 100, fixedAfter: null, commonVolatility: 'remove', truncateAt: 4 }
const all = (n: number): Uint8Array => new Uint8Array(n).fill(1)

/** The definition: the middle of the sorted values. */
function median(values: readonly number[]): number {
  const sorted = [...values].sort((a, b) => a - b)
  const middle = sorted.length >> 1
  return sorted.length % 2 === 1 ? sorted[middle]! : (sorted[middle - 1]! + sorted[middle]!) / 2
}

const size = fc.oneof(fc.double({ min: 0, max: 100, noNaN: true }), fc.constantFrom(0, 1, 1, 2))

describe('medians', () => {
  test('the sliding median is the median of the last values, exactly', () => {
    fc.assert(
      fc.property(
        fc.array(size, { minLength: 1, maxLength: 80 }),
        fc.integer({ min: 1, max: 20 }),
        (values, span) => {
          const sliding = new SlidingMedian(span)
          for (const [t, value] of values.entries()) {
            sliding.push(value)
            const last = values.slice(Math.max(0, t + 1 - span), t + 1)
            expect(sliding.count).toBe(last.length)
            expect(sliding.median).toBe(median(last))
            const square = last.reduce((sum, v) => sum + v * v, 0) / last.length
            expect(sliding.rootMeanSquare).toBeCloseTo(Math.sqrt(square), 10)
          }
        },
      ),
      { seed: 3 },
    )
  })

  test('selection finds the median whatever the order', () => {
    fc.assert(
      fc.property(fc.array(size, { minLength: 1, maxLength: 60 }), (values) => {
        expect(medianOf(Float64Array.from([...values, -5]), values.length)).toBe(median(values))
      }),
      { seed: 4, numRuns: 300 },
    )
    expect(medianOf(new Float64Array(3), 0)).toBe(0)
  })

  test('a huge value that has left leaves no trace in the root mean square', () => {
    const sliding = new SlidingMedian(3)
    for (const value of [1e90, 1, 2, 2]) sliding.push(value)
    expect(sliding.rootMeanSquare).toBeCloseTo(Math.sqrt(3), 14)
  })
})

describe('scale', () => {
  test('with nothing to remove and nothing to truncate, values pass to the last bit', () => {
    const scaler = new Scaler({ ...options, commonVolatility: 'keep', truncateAt: null })
    fc.assert(
      fc.property(fc.array(fc.double({ noNaN: true }), { minLength: 1, maxLength: 9 }), (values) => {
        const x = Float64Array.from(values)
        const result = scaler.scale(x, all(x.length))!
        expect(result.scaled).toEqual(x)
        expect(result.cleaned).toEqual(x)
        expect(result.clipped).toBe(0)
        expect(result.volatility).toBe(1)
      }),
      { seed: 1 },
    )
  })

  test('no frame is fit for use before a signal has 20 entries', () => {
    const scaler = new Scaler(options)
    for (let t = 0; t < 20; t++) expect(scaler.scale(Float64Array.of(1 + t, 2), all(2))).toBeNull()
    expect(scaler.scale(Float64Array.of(1, 2), all(2))!.present).toEqual(all(2))
  })

  test('a signal is measured in 1.4826 medians of its own |x| before this frame', () => {
    const scaler = new Scaler({ ...options, commonVolatility: 'keep', truncateAt: 100 })
    const random = new Random(9)
    const before: number[] = []
    for (let t = 0; t < 300; t++) {
      const x = 7 * random.normal()
      const result = scaler.scale(Float64Array.of(x), all(1))
      if (t >= 20) {
        const own = 1.482602218505602 * median(before.slice(-100).map(Math.abs))
        expect(result!.scaled[0]).toBeCloseTo(x / own, 12)
      }
      before.push(x)
    }
  })

  test('a signal at rest for more than half of the time is measured by its root mean square', () => {
    const scaler = new Scaler({ ...options, commonVolatility: 'keep' })
    for (let t = 0; t < 40; t++) scaler.scale(Float64Array.of(t % 4 === 0 ? 6 : 0, 1), all(2))
    expect(scaler.scale(Float64Array.of(6, 1), all(2))!.scaled[0]).toBeCloseTo(6 / 3, 12)
  })

  test('a signal that never moves is missing, not zero', () => {
    const scaler = new Scaler(options)
    let last = scaler.scale(Float64Array.of(0, 1), all(2))
    for (let t = 0; t < 30; t++) last = scaler.scale(Float64Array.of(0, 1 + (t % 3)), all(2))
    expect(last!.present).toEqual(Uint8Array.of(0, 1))
  })

  test('common volatility: all amplitudes times 50 for a while change nothing in the result', () => {
    const calm = new Scaler({ ...options, truncateAt: null })
    const loud = new Scaler({ ...options, truncateAt: null })
    const random = new Random(10)
    for (let t = 0; t < 60; t++) {
      const x = Float64Array.from({ length: 12 }, () => random.normal())
      const factor = t >= 40 && t < 50 ? 50 : 1
      const a = calm.scale(x, all(12))
      const b = loud.scale(
        x.map((value) => factor * value),
        all(12),
      )
      if (t >= 20 && t <= 40) {
        for (let i = 0; i < 12; i++) expect(b!.scaled[i]).toBeCloseTo(a!.scaled[i]!, 10)
        expect(b!.volatility).toBeCloseTo(factor * a!.volatility, 10)
      }
    }
  })

  test('common volatility leaves before anything is clipped (detection-study): a loud frame is clipped no more', () => {
    const scaler = new Scaler(options)
    const random = new Random(11)
    const noise = (): Float64Array => Float64Array.from({ length: 40 }, () => random.normal())
    for (let t = 0; t < 100; t++) scaler.scale(noise(), all(40))
    let clipped = 0
    for (let t = 0; t < 20; t++)
      clipped += scaler.scale(
        noise().map((x) => 20 * x),
        all(40),
      )!.clipped
    // At 20 times the scale, clipping first would cut 84 % of all entries: P(|x| > 4/20).
    expect(clipped / 800).toBeLessThan(0.01)
  })

  test('what is beyond ±K is brought to ±K and counted, in cleaned alone', () => {
    const scaler = new Scaler(options)
    const random = new Random(12)
    const noise = (): Float64Array => Float64Array.from({ length: 20 }, () => random.normal())
    for (let t = 0; t < 60; t++) scaler.scale(noise(), all(20))
    const x = noise()
    x[3] = -500
    x[7] = 900
    const { scaled, cleaned, clipped, clippedSignals } = scaler.scale(x, all(20))!
    expect(clippedSignals).toEqual([3, 7])
    expect(clipped).toBe(2)
    expect([cleaned[3], cleaned[7]]).toEqual([-4, 4])
    expect(scaled[3]!).toBeLessThan(-100)
    for (let i = 0; i < 20; i++) if (i !== 3 && i !== 7) expect(cleaned[i]).toBe(scaled[i])
  })

  test('a frame in which nothing moves is a frame of zeros', () => {
    const scaler = new Scaler(options)
    for (let t = 0; t < 30; t++) scaler.scale(Float64Array.of(1, -2, 3), all(3))
    const still = scaler.scale(new Float64Array(3), all(3))!
    expect(still.scaled).toEqual(new Float64Array(3))
    expect(still.volatility).toBe(1)
    expect(still.present).toEqual(all(3))
  })

  test('a frame in which most signals rest is measured by its root mean square', () => {
    const scaler = new Scaler({ ...options, truncateAt: null })
    for (let t = 0; t < 30; t++) scaler.scale(Float64Array.of(1, 1, 1, 1), all(4))
    const { scaled, volatility } = scaler.scale(Float64Array.of(0, 0, 0, 1), all(4))!
    expect(volatility).toBeCloseTo(1 / 1.482602218505602 / 2, 12)
    expect(scaled[3]).toBeCloseTo(2, 12)
  })

  test('fixed scales stay what they were when the signal grows', () => {
    const scaler = new Scaler({ ...options, commonVolatility: 'keep', fixedAfter: 40 })
    for (let t = 0; t < 40; t++) scaler.scale(Float64Array.of(1), all(1))
    for (let t = 0; t < 200; t++) scaler.scale(Float64Array.of(3), all(1))
    expect(scaler.scale(Float64Array.of(3), all(1))!.scaled[0]).toBeCloseTo(3 / 1.482602218505602, 12)
  })

  test('nothing that is not finite, or beyond all bounds, leaves', () => {
    const wild = fc.oneof(
      fc.double({ min: -1e100, max: 1e100, noNaN: true }),
      fc.constantFrom(0, 5e-324, -5e-324, 1e-200, 1e100, -1e100, 1),
    )
    fc.assert(
      fc.property(fc.array(fc.tuple(wild, wild, wild), { minLength: 21, maxLength: 60 }), (rows) => {
        const scaler = new Scaler({ ...options, span: 25 })
        for (const row of rows) {
          const result = scaler.scale(Float64Array.from(row), all(3))
          if (result === null) continue
          for (const i of [0, 1, 2]) {
            expect(Math.abs(result.scaled[i]!)).toBeLessThanOrEqual(1e100)
            expect(Math.abs(result.cleaned[i]!)).toBeLessThanOrEqual(4)
            if (result.present[i] === 0) expect(result.scaled[i]).toBe(0)
          }
          expect(Number.isFinite(result.volatility)).toBe(true)
        }
      }),
      { seed: 2 },
    )
  })
})
