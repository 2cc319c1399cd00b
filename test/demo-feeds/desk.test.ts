import { EigenvalueDecomposition, Matrix } from 'ml-matrix'
import { describe, expect, test } from 'vitest'
import { type DemoChunk, defaultClock, plantedTimes } from '../../demo-feeds/demo-feed.ts'
import { deskEvents, deskReadings, deskSectors, deskSignals } from '../../demo-feeds/desk.ts'
import { correlation, logReturns, meanEntry, sampled, spatialSigns } from './sampled.ts'

const { start, stepMs, latenessMs } = defaultClock
const n = deskSignals.length
const chunks = [...deskReadings()]
const rows = sampled(chunks, start, stepMs)
const returns = logReturns(rows)
const planted = (what: string) => deskEvents().find((event) => event.what === what)!

/** Correlation of the returns that lie wholly in frames `from` to `to`, common volatility removed. */
const during = (from: number, to: number) => correlation(spatialSigns(returns.slice(from, to - 1)))
const leadingShare = (matrix: Float64Array[]) => {
  const plain = new Matrix(matrix.map((row) => [...row]))
  return Math.max(...new EigenvalueDecomposition(plain, { assumeSymmetric: true }).realEigenvalues) / n
}
const oldPartners = (i: number, j: number) => Math.floor(i / 12) === Math.floor(j / 12)
const newPartners = (i: number, j: number) => i % 4 === j % 4
const readings = (list: readonly DemoChunk[]) => list.reduce((sum, { count }) => sum + count, 0)

describe('the invented desk', () => {
  test('has 48 different instruments in four sectors of twelve', () => {
    expect(new Set(deskSignals).size).toBe(48)
    expect(Object.values(deskSectors).map(({ length }) => length)).toEqual([12, 12, 12, 12])
  })

  test('ticks at its own pace: Poisson counts, and rates that spread over more than a factor of three', () => {
    const calm = chunks.slice(1080, 3900)
    const counts = calm.map((chunk) => {
      const count = new Float64Array(n)
      for (let i = 0; i < chunk.count; i++) count[chunk.signal[i]!]!++
      return count
    })
    const means = deskSignals.map((_, j) => counts.reduce((sum, count) => sum + count[j]!, 0) / counts.length)
    expect(Math.max(...means) / Math.min(...means)).toBeGreaterThan(3)
    // Median 6 a frame by design; the median of 48 log-normal rates has a standard error of 0.4.
    const median = [...means].sort((a, b) => a - b)[24]!
    expect(median).toBeGreaterThan(4.8)
    expect(median).toBeLessThan(7.4)
    // A Poisson count has its mean as its variance: standard error of the ratio √(2/2820) = 2.7 %.
    deskSignals.forEach((_, j) => {
      const variance = counts.reduce((sum, count) => sum + (count[j]! - means[j]!) ** 2, 0) / counts.length
      expect(Math.abs(variance / means[j]! - 1)).toBeLessThan(0.12)
    })
  })

  test('has fat tails: far more returns beyond five standard deviations than a normal law has', () => {
    const calm = returns.slice(1080, 1499)
    const scaled = calm.flatMap((row) => [...row].map((value, j) => value / rms(calm, j)))
    const beyond = scaled.filter((value) => Math.abs(value) > 5).length / scaled.length
    // Normal law: 5.7e-7.
    expect(beyond).toBeGreaterThan(1e-4)
  })

  test('trades about half as often in the lull, and as before when it ends', () => {
    const { from, to } = planted('lull')
    const before = readings(chunks.slice(from - 180, from)) / 180
    expect(readings(chunks.slice(from + 60, to! - 60)) / 60 / before).toBeCloseTo(0.55, 1)
    expect(readings(chunks.slice(to!, to! + 180)) / 180 / before).toBeCloseTo(1, 1)
  })

  test('one flash print is one reading of one instrument, 12 % off, and nothing else', () => {
    const event = planted('flash-print')
    const without = [...deskReadings({ frames: 430 }, [])]
    const extra = readings(chunks.slice(0, 430)) - readings(without)
    expect(extra).toBe(1)
    const flash = deskSignals.indexOf(event.signals[0]!)
    expect(returns[event.from - 1]![flash]).toBeCloseTo(Math.log(0.88), 2)
    expect(returns[event.from]![flash]).toBeCloseTo(-Math.log(0.88), 2)
    const others = returns
      .slice(event.from - 1, event.from + 1)
      .flatMap((row) => [...row.filter((_, j) => j !== flash)])
    expect(Math.max(...others.map(Math.abs))).toBeLessThan(0.02)
  })

  test('the volatility burst makes every movement three times as large, and leaves correlation alone', () => {
    const event = planted('volatility-burst')
    const all = deskEvents()
    const without = [
      ...deskReadings(
        { frames: 700 },
        all.filter(({ what }) => what !== 'volatility-burst'),
      ),
    ]
    const quiet = logReturns(sampled(without, start, stepMs))
    const inside = [event.from, event.to! - 1] as const
    const ratios = deskSignals.map(
      (_, j) => rms(returns.slice(...inside), j) / rms(quiet.slice(...inside), j),
    )
    // A little under 3: half-spreads do not grow.
    for (const ratio of ratios) {
      expect(ratio).toBeGreaterThan(2.8)
      expect(ratio).toBeLessThan(3.05)
    }
    const quietMean = meanEntry(correlation(spatialSigns(quiet.slice(...inside))))
    expect(Math.abs(meanEntry(during(event.from, event.to!)) - quietMean)).toBeLessThan(0.02)
  })

  test('in the market-mode spike the leading share goes up by half and more, and comes back', () => {
    const { from, to } = planted('market-mode-spike')
    const before = leadingShare(during(1080, from))
    const spike = leadingShare(during(from, to!))
    const after = leadingShare(during(to!, 3900))
    expect(spike / before).toBeGreaterThan(1.4)
    expect(Math.abs(after - before)).toBeLessThan(0.03)
    // Without the removal of common volatility the mean correlation is that of the design, less what
    // asynchronous ticks and the spread take: calm 0.25 + 0.22·11/47 = 0.30, spike 0.55 + 0.132·11/47 = 0.58.
    expect(meanEntry(correlation(returns.slice(2400, 3899)))).toBeGreaterThan(0.2)
    expect(meanEntry(correlation(returns.slice(2400, 3899)))).toBeLessThan(0.3)
    expect(meanEntry(correlation(returns.slice(from, to! - 1)))).toBeGreaterThan(0.4)
    expect(meanEntry(correlation(returns.slice(from, to! - 1)))).toBeLessThan(0.58)
  })

  test('the rotation changes who moves with whom, not how strongly', () => {
    const { from } = planted('rotation')
    const before = during(2400, from)
    const after = during(from, 5400)
    expect(meanEntry(before, oldPartners) - meanEntry(before, newPartners)).toBeGreaterThan(0.1)
    expect(meanEntry(after, newPartners) - meanEntry(after, oldPartners)).toBeGreaterThan(0.1)
    expect(Math.abs(meanEntry(after) - meanEntry(before))).toBeLessThan(0.03)
    expect(Math.abs(leadingShare(after) - leadingShare(before))).toBeLessThan(0.03)
  })

  test('readings come in order of arrival, some late, none later than allowed', () => {
    let late = 0
    let last = Number.NEGATIVE_INFINITY
    for (const { count, time, arrival, until } of chunks)
      for (let i = 0; i < count; i++) {
        const delay = arrival[i]! - time[i]!
        if (arrival[i]! < last || arrival[i]! >= until || delay < 0 || delay > latenessMs)
          throw new Error(`reading ${i} of the span that ends at ${until}`)
        if (delay > 0) late++
        last = arrival[i]!
      }
    expect(late / readings(chunks)).toBeCloseTo(0.03, 2)
  })

  test('no signal has two readings of one time', () => {
    const seen = new Set<string>()
    for (const { count, signal, time } of chunks.slice(0, 300))
      for (let i = 0; i < count; i++) seen.add(`${signal[i]}@${time[i]}`)
    expect(seen.size).toBe(readings(chunks.slice(0, 300)))
  })

  test('a second round has the same events 5,400 frames later, and rotates back', () => {
    const [first, second] = [deskEvents(2).slice(0, 5), deskEvents(2).slice(5)]
    expect(second.map(({ from }) => from - 5400)).toEqual(first.map(({ from }) => from))
    expect(plantedTimes(second[0]!, defaultClock).from).toBe(start + (5400 + 420) * stepMs)
    const rotated = deskEvents().map((event) => (event.what === 'rotation' ? { ...event, from: 0 } : event))
    const twice = [...rotated, { ...rotated[4]!, from: 600 }]
    const sample = sampled(deskReadings({ frames: 1200 }, twice), start, stepMs)
    const changes = logReturns(sample)
    const sectorGap = (from: number, to: number) => {
      const matrix = correlation(spatialSigns(changes.slice(from, to)))
      return meanEntry(matrix, oldPartners) - meanEntry(matrix, newPartners)
    }
    expect(sectorGap(0, 599)).toBeLessThan(-0.1)
    expect(sectorGap(600, 1199)).toBeGreaterThan(0.1)
  })
})

function rms(list: readonly Float64Array[], j: number): number {
  return Math.sqrt(list.reduce((sum, row) => sum + row[j]! ** 2, 0) / list.length)
}
