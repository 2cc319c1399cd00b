import { describe, expect, test } from 'vitest'
import { fitAutoregression } from '../../src/frames/autoregression.ts'
import { EffectiveShare } from '../../src/frames/effective-share.ts'
import { Memory } from '../../src/frames/memory.ts'
import { type OpenTable, testWithOpenData } from '../support/open-data.ts'
import { Random } from '../support/random.ts'
import { withoutYear } from '../support/without-year.ts'

/** x_t = Σ φ_k x_{t−k} + e_t with standard normal e, after a run-in. */
function autoregressive(random: Random, weights: readonly number[], length: number): Float64Array {
  const x = new Float64Array(length + 200)
  for (let t = 0; t < x.length; t++) {
    x[t] = random.normal()
    for (const [k, weight] of weights.entries()) x[t] = x[t]! + weight * (x[t - 1 - k] ?? 0)
  }
  return x.slice(200)
}

/** Lag-1 autocorrelation about zero. */
function lagOne(x: readonly number[]): number {
  let lagged = 0
  let square = 0
  for (let t = 1; t < x.length; t++) {
    lagged += x[t]! * x[t - 1]!
    square += x[t]! * x[t]!
  }
  return lagged / square
}

let held = new Float64Array(8)
const everywhere = (n: number): Uint8Array => new Uint8Array(n).fill(1)

describe('autoregression', () => {
  test('Yule–Walker for order 1 is the lag-1 autocorrelation', () => {
    const x = autoregressive(new Random(3), [0.6], 4000)
    const mean = x.reduce((sum, value) => sum + value, 0) / x.length
    let lagged = 0
    let square = 0
    for (let t = 0; t < x.length; t++) {
      square += (x[t]! - mean) ** 2
      if (t > 0) lagged += (x[t]! - mean) * (x[t - 1]! - mean)
    }
    const { weights } = fitAutoregression(x)
    expect(weights).toHaveLength(1)
    expect(weights[0]).toBeCloseTo(lagged / square, 10)
    expect(weights[0]).toBeCloseTo(0.6, 1)
  })

  test('the order is found: independence, two lags, three lags', () => {
    expect(fitAutoregression(autoregressive(new Random(5), [], 2000)).weights).toEqual([])
    const two = fitAutoregression(autoregressive(new Random(6), [1.1, -0.5], 4000)).weights
    expect(two).toHaveLength(2)
    expect(two[0]).toBeCloseTo(1.1, 1)
    expect(two[1]).toBeCloseTo(-0.5, 1)
    expect(fitAutoregression(autoregressive(new Random(7), [0.3, 0, 0.4], 4000)).weights).toHaveLength(3)
  })

  test('missing values do not pull the coefficient to zero, nor does a flash print', () => {
    const random = new Random(8)
    const x = autoregressive(random, [0.7], 4000)
    const holed = x.map((value) => (random.uniform() < 0.4 ? Number.NaN : value))
    expect(fitAutoregression(holed).weights[0]).toBeGreaterThan(0.6)
    const flashed = x.slice(0, 400)
    flashed[100] = 200
    expect(fitAutoregression(flashed).weights[0]).toBeGreaterThan(0.55)
  })

  test('is stationary whatever it is fitted to', () => {
    const ramp = Float64Array.from({ length: 200 }, (_, t) => t * t)
    const alternating = Float64Array.from({ length: 200 }, (_, t) => (t % 2 === 0 ? 1 : -1))
    for (const x of [ramp, alternating, new Float64Array(200), new Float64Array(200).fill(Number.NaN)]) {
      const { mean, weights } = fitAutoregression(x)
      expect(Number.isFinite(mean)).toBe(true)
      // The response to one shock dies out.
      const response = [1]
      for (let t = 1; t < 20_000; t++)
        response.push(weights.reduce((sum, w, k) => sum + w * (response[t - 1 - k] ?? 0), 0))
      expect(Math.abs(response.at(-1)!)).toBeLessThan(1e-3)
    }
  })
})

describe('prewhitening', () => {
  test('takes the memory out of what comes after the fit', () => {
    const x = autoregressive(new Random(21), [0.5, 0.2], 5000)
    const memory = new Memory('prewhiten', 1000)
    const residuals: number[] = []
    for (const value of x) {
      const row = Float64Array.of(value)
      const present = everywhere(1)
      memory.apply(row, present)
      if (present[0] === 1) residuals.push(row[0]!)
    }
    expect(residuals).toHaveLength(4000)
    // Two standard errors of an autocorrelation of 4000 independent values are 0.032.
    expect(Math.abs(lagOne(residuals))).toBeLessThan(0.05)
    expect(lagOne([...x])).toBeGreaterThan(0.5)
  })

  test('a signal is missing until it is fitted, and next to a missing value', () => {
    const x = autoregressive(new Random(22), [0.8], 320)
    const memory = new Memory('prewhiten', 300)
    const seen: number[] = []
    for (let t = 0; t < 320; t++) {
      const present = Uint8Array.of(t === 310 ? 0 : 1)
      const row = Float64Array.of(present[0] === 1 ? x[t]! : 0)
      memory.apply(row, present)
      seen.push(present[0]!)
      if (present[0] === 0) expect(row[0]).toBe(0)
    }
    expect(seen.slice(0, 300).every((has) => has === 0)).toBe(true)
    expect(seen.slice(300)).toEqual(Array.from({ length: 20 }, (_, k) => (k === 10 || k === 11 ? 0 : 1)))
  })

  /** Residuals of x under a fit over 240 steps, NaN where there is none; `there` tells when x has a value. */
  function whitened(x: Float64Array, there: (t: number) => boolean, memory: Memory): number[] {
    return [...x].map((value, t) => {
      const row = Float64Array.of(there(t) ? value : 0)
      const present = Uint8Array.of(there(t) ? 1 : 0)
      memory.apply(row, present)
      return present[0] === 1 ? row[0]! : Number.NaN
    })
  }

  test('a signal that hardly spoke at first is fitted once it has had half of the values', () => {
    const seeds = Array.from({ length: 12 }, (_, k) => 240 + k)
    const left = seeds.map((seed) => {
      const x = autoregressive(new Random(seed), [0.8], 3000)
      const residuals = whitened(x, (t) => t < 2 || t >= 240, new Memory('prewhiten', 240))
      const first = residuals.findIndex((residual) => !Number.isNaN(residual))
      expect(first).toBe(240 + 118)
      return lagOne(residuals.slice(first))
    })
    // From 120 values r̂ errs by √((1 − r²)/120) = 0.055 and is (1 + 4r)/120 = 0.035 too small (Kendall 1954, from
    // memory); residuals under r̂ = r − d keep d(1 − r² + rd)/(1 − r² + d²), which is about d.
    const mean = left.reduce((sum, r) => sum + r, 0) / left.length
    expect(Math.abs(mean)).toBeLessThan(0.035 + (3 * 0.055) / Math.sqrt(left.length))
  })

  test('what is kept for the fit of a signal that speaks now and then stays small', () => {
    const memory = new Memory('prewhiten', 240)
    const x = autoregressive(new Random(25), [0.8], 12_000)
    whitened(x.slice(0, 11_900), (t) => t % 100 === 0, memory)
    expect(memory.snapshot().histories[0]!.model).toBeNull()
    // One value and three missing ones beside it.
    expect(memory.snapshot().histories[0]!.learning).toHaveLength(119 * 4)
    whitened(x.slice(11_900), (t) => t % 100 === 0, memory)
    expect(memory.snapshot().histories[0]).toMatchObject({ learning: null, model: { weights: [] } })
  })

  test('a signal that rested all the while is not fitted before it has moved', () => {
    const x = autoregressive(new Random(26), [0.8], 4000)
    const residuals = whitened(x.fill(7, 0, 700), () => true, new Memory('prewhiten', 240))
    const first = residuals.findIndex((residual) => !Number.isNaN(residual))
    // It begins anew at 240 and 480; the fit over [480, 720) holds the first values that move.
    expect(first).toBe(720)
    const moving = whitened(x.fill(7, 0, 720), () => true, new Memory('prewhiten', 240))
    expect(moving.findIndex((residual) => !Number.isNaN(residual))).toBe(960)
    expect(Math.abs(lagOne(moving.slice(960)))).toBeLessThan(0.15)
  })

  test('does not look back over an interruption', () => {
    const memory = new Memory('prewhiten', 300)
    for (const value of autoregressive(new Random(23), [0.8], 300))
      memory.apply(Float64Array.of(value), everywhere(1))
    memory.interrupt()
    const present = everywhere(1)
    memory.apply(Float64Array.of(1), present)
    expect(present[0]).toBe(0)
    const next = everywhere(1)
    memory.apply(Float64Array.of(1), next)
    expect(next[0]).toBe(1)
  })
})

describe('effective sample', () => {
  const worth = (signals: readonly Float64Array[]): number => {
    const share = new EffectiveShare()
    for (let t = 0; t < signals[0]!.length; t++)
      share.push(
        Float64Array.from(signals, (x) => x[t]!),
        everywhere(signals.length),
      )
    return share.value
  }
  const many = (n: number, weights: readonly number[], seed: number): Float64Array[] => {
    const random = new Random(seed)
    return Array.from({ length: n }, () => autoregressive(random, weights, 3000))
  }

  test('for a common AR(1) coefficient r it is (1 − r²)/(1 + r²) (Bartlett 1935)', () => {
    for (const r of [0.3, 0.515, 0.8]) {
      const expected = (1 - r * r) / (1 + r * r)
      expect(Math.abs(worth(many(60, [r], 31)) / expected - 1)).toBeLessThan(0.08)
    }
    expect(worth(many(60, [], 32))).toBeGreaterThan(0.98)
  })

  test('the wind stations: r = 0.515 and T = 100 put the edge of 12 signals at 2.116 (check-values)', () => {
    const edge = (share: number): number => (1 + Math.sqrt(12 / (100 * share))) ** 2
    expect(edge((1 - 0.515 ** 2) / (1 + 0.515 ** 2))).toBeCloseTo(2.116, 3)
    expect(edge(1)).toBeCloseTo(1.8128, 4)
    expect(Math.abs(edge(worth(many(12, [0.515], 33))) - 2.116)).toBeLessThan(0.08)
  })

  test('signs count: what persists in one and alternates in the other cancels at every other lag', () => {
    // Two signals with r, two with −r; over the 6 pairs ρρ is r^2k at even lags and −r^2k/3 at odd ones.
    const r2 = 0.49
    const expected = 1 / (1 + (2 * (r2 * r2 - r2 / 3)) / (1 - r2 * r2))
    const share = worth([...many(2, [0.7], 34), ...many(2, [-0.7], 35)])
    expect(Math.abs(share - expected)).toBeLessThan(0.1)
    expect(Math.abs(worth(many(4, [0.7], 36)) - (1 - r2) / (1 + r2))).toBeLessThan(0.1)
  })

  test('a memory that shows at the second lag only is seen as well', () => {
    // ρ is r^k at lag 2k and nothing between: (1 − r²)/(1 + r²) once more.
    expect(Math.abs(worth(many(12, [0, 0.7], 38)) - 0.51 / 1.49)).toBeLessThan(0.08)
  })

  test('values on both sides of an interruption are no neighbours', () => {
    const [one, other] = [new Memory('effective-sample', 0), new Memory('effective-sample', 0)]
    const random = new Random(39)
    for (let t = 0; t < 2000; t++) {
      if (t % 2 === 0) other.interrupt()
      // Pairs of equal values: every second neighbour is the same value, the others are independent.
      const x = t % 2 === 0 ? Float64Array.from({ length: 8 }, () => random.normal()) : held
      held = x
      one.apply(x.slice(), everywhere(8))
      other.apply(x.slice(), everywhere(8))
    }
    // Lag 1 is ρ = 1/2 over all neighbours, and 1 over those that are left.
    expect(one.effectiveShare).toBeCloseTo(1 / (1 + 2 / 4), 1)
    expect(other.effectiveShare).toBeCloseTo(1 / (1 + 2), 2)
  })

  test('goes on from a snapshot bit for bit', () => {
    const signals = many(5, [0.6], 37)
    const through = new EffectiveShare()
    let other = new EffectiveShare()
    for (let t = 0; t < 400; t++) {
      const x = Float64Array.from(signals, (series) => series[t]!)
      const present = Uint8Array.from(signals, (_, i) => ((t + i) % 7 === 0 ? 0 : 1))
      through.push(x, present)
      other.push(x, present)
      if (t % 50 === 0) {
        const snapshot = structuredClone(other.snapshot())
        other = new EffectiveShare()
        other.restore(snapshot)
      }
    }
    expect(other.value).toBe(through.value)
    expect(other.snapshot()).toEqual(through.snapshot())
  })
})

describe('the wind stations (Haslett & Raftery 1989; figures of check-values, by numpy)', () => {
  const meanOf = (values: readonly number[]): number => values.reduce((sum, v) => sum + v, 0) / values.length
  const stationsOf = ({ signals, dates, values }: OpenTable): Float64Array[] => {
    const clean = withoutYear(values, signals.length)
    return signals.map((_, i) => Float64Array.from(dates, (_, t) => clean[t * signals.length + i]!))
  }

  testWithOpenData('wind', 'have lag-1 autocorrelations of 0.43 to 0.56, 0.515 on average', (wind) => {
    const r = stationsOf(wind).map((station) => lagOne([...station]))
    expect(Math.min(...r)).toBeCloseTo(0.43, 2)
    expect(Math.max(...r)).toBeCloseTo(0.56, 2)
    expect(meanOf(r)).toBeCloseTo(0.515, 3)
  })

  testWithOpenData('wind', 'put the edge of a window of 100 days near 2.116, not at 1.8128', (wind) => {
    const stations = stationsOf(wind)
    const days = wind.dates.length
    const random = new Random(40)
    // Each shifted round by its own offset: memory is all that they share.
    const from = stations.map(() => random.below(days))
    const share = new EffectiveShare()
    const shares: number[] = []
    for (let t = 0; t < days; t++) {
      share.push(
        Float64Array.from(stations, (station, i) => station[(t + from[i]!) % days]!),
        everywhere(stations.length),
      )
      if (t % 500 === 499) shares.push(share.value)
    }
    const edge = (share: number): number => (1 + Math.sqrt(stations.length / (100 * share))) ** 2
    // Bartlett's sum over the whole record: the stations remember a little more than their first lag says.
    let sum = 0
    for (let lag = 1; lag <= 20; lag++) {
      const r = stations.map((x) => {
        const products = x.map((value, t) => (t < lag ? 0 : value * x[t - lag]!))
        return meanOf([...products]) / meanOf([...x.map((value) => value * value)])
      })
      const pairs = stations.length * (stations.length - 1)
      sum += (meanOf(r) ** 2 * stations.length ** 2 - r.reduce((squares, v) => squares + v * v, 0)) / pairs
    }
    const whole = edge(1 / (1 + 2 * sum))
    expect(Math.abs(whole - 2.116)).toBeLessThan(0.04)
    // Shares at 13 times scatter by 0.022: the edge of their mean errs by 0.007.
    expect(Math.abs(edge(meanOf(shares)) - whole)).toBeLessThan(0.03)
  })

  testWithOpenData('wind', 'lose nearly all memory to a fit over their first 400 days', (wind) => {
    const stations = stationsOf(wind)
    const memory = new Memory('prewhiten', 400)
    const residuals = stations.map((): number[] => [])
    for (let t = 0; t < wind.dates.length; t++) {
      const row = Float64Array.from(stations, (station) => station[t]!)
      memory.apply(row, everywhere(stations.length))
      if (t >= 400) for (const [i, residual] of row.entries()) residuals[i]!.push(residual)
    }
    // A coefficient from 400 days errs by √((1 − r²)/400) = 0.043.
    const left = residuals.map(lagOne)
    expect(Math.max(...left.map(Math.abs))).toBeLessThan(4 * 0.043)
    expect(Math.abs(meanOf(left))).toBeLessThan(0.1)
  })
})
