import { describe, expect, test } from 'vitest'
import { defaultClock } from '../../demo-feeds/demo-feed.ts'
import { stationEvents, stationParts, stationReadings, stationSignals } from '../../demo-feeds/station.ts'
import { correlation, lagOne, meanEntry, sampled } from './sampled.ts'

const { start, stepMs, latenessMs } = defaultClock
const chunks = [...stationReadings()]
const rows = sampled(chunks, start, stepMs)
const planted = (what: string) => stationEvents().find((event) => event.what === what)!

/** Mean of |correlation| among the transmitters of a part, frames `from` to `to`. */
function together(part: string, from: number, to: number): number {
  const members = stationParts[part]!.map((tag) => stationSignals.indexOf(tag))
  const inside = rows.slice(from, to).map((row) => Float64Array.from(members, (j) => row[j]!))
  return meanEntry(correlation(inside).map((row) => row.map(Math.abs)))
}

describe('the invented pumping station', () => {
  test('has 36 different transmitters: 10 pressures, 8 flows, 8 temperatures, 4 vibrations, 3 levels, 3 powers', () => {
    expect(new Set(stationSignals).size).toBe(36)
    const count = (kind: string) => stationSignals.filter((tag) => tag.startsWith(kind)).length
    expect(['PT', 'FT', 'TT', 'VT', 'LT', 'JT'].map(count)).toEqual([10, 8, 8, 4, 3, 3])
  })

  test('scans every transmitter once a frame and flows twice, and loses three readings in a thousand', () => {
    const total = chunks.reduce((sum, { count }) => sum + count, 0)
    expect(total / (5400 * (36 + 8))).toBeCloseTo(0.997, 3)
  })

  test('remembers: every transmitter has a lag-1 autocorrelation between 0.3 and 0.75', () => {
    const calm = rows.slice(0, 700)
    const running = stationSignals.filter((tag) => !stationParts['pump-b']!.includes(tag))
    for (const tag of running) {
      const lag = lagOne(calm, stationSignals.indexOf(tag))
      expect(lag, tag).toBeGreaterThan(0.3)
      expect(lag, tag).toBeLessThan(0.75)
    }
  })

  test('its parts move together, each by the share of its design', () => {
    // Header: 0.65 of the variance is demand; exchanger: 0.60 + 0.15; pump: 0.40 + 0.30.
    expect(together('header', 0, 700)).toBeCloseTo(0.65, 1)
    expect(together('exchanger', 0, 700)).toBeCloseTo(0.75, 1)
    expect(together('pump-a', 0, 700)).toBeCloseTo(0.7, 1)
    expect(together('pump-b', 0, 700)).toBeLessThan(0.1)
  })

  test('the stuck transmitter gives one value while it sticks, and many before and after', () => {
    const { from, to, signals } = planted('stuck')
    const j = stationSignals.indexOf(signals[0]!)
    const values = (a: number, b: number) => new Set(rows.slice(a, b).map((row) => row[j]!)).size
    expect(values(from + 1, to!)).toBe(1)
    expect(values(from - 100, from)).toBeGreaterThan(50)
    expect(values(to! + 1, to! + 100)).toBeGreaterThan(50)
  })

  test('a fouling exchanger lets go of its transmitters slowly, and holds them again when cleaned', () => {
    const { from, to } = planted('fouling')
    expect(together('exchanger', from - 500, from)).toBeGreaterThan(0.65)
    const third = together('exchanger', from + 100, from + 300)
    expect(third).toBeGreaterThan(0.3)
    expect(third).toBeLessThan(0.75)
    expect(together('exchanger', from + 600, to!)).toBeLessThan(0.25)
    expect(together('exchanger', to!, 5400)).toBeGreaterThan(0.65)
  })

  test('at the change-over pump B takes over from pump A within twelve frames', () => {
    const { from } = planted('change-over')
    expect(together('pump-a', 2400, from)).toBeGreaterThan(0.6)
    expect(together('pump-b', 2400, from)).toBeLessThan(0.1)
    expect(together('pump-a', from + 12, 5400)).toBeLessThan(0.1)
    expect(together('pump-b', from + 12, 5400)).toBeGreaterThan(0.6)
    const mean = (tag: string, a: number, b: number) =>
      rows.slice(a, b).reduce((sum, row) => sum + row[stationSignals.indexOf(tag)]!, 0) / (b - a)
    // Running 6.2 bar; at rest eight spans of 0.08 bar below it.
    expect(mean('PT-101', 2400, from)).toBeCloseTo(6.2, 1)
    expect(mean('PT-101', from + 12, 5400)).toBeCloseTo(5.56, 1)
    expect(mean('PT-107', 2400, from)).toBeCloseTo(5.56, 1)
    expect(mean('PT-107', from + 12, 5400)).toBeCloseTo(6.2, 1)
  })

  test('readings come in order of arrival, some late, none later than allowed', () => {
    let late = 0
    let total = 0
    let last = Number.NEGATIVE_INFINITY
    for (const { count, time, arrival, until } of chunks)
      for (let i = 0; i < count; i++) {
        const delay = arrival[i]! - time[i]!
        if (arrival[i]! < last || arrival[i]! >= until || delay < 0 || delay > latenessMs)
          throw new Error(`reading ${i} of the span that ends at ${until}`)
        if (delay > 0) late++
        total++
        last = arrival[i]!
      }
    expect(late / total).toBeCloseTo(0.02, 2)
  })

  test('a second round fouls again and changes back to pump A', () => {
    const events = stationEvents(2).filter(({ what }) => what === 'change-over')
    const early = events.map((event, k) => ({ ...event, from: 200 * (k + 1) }))
    const sample = sampled(stationReadings({ frames: 700 }, early), start, stepMs)
    const j = stationSignals.indexOf('PT-101')
    const mean = (a: number, b: number) => sample.slice(a, b).reduce((sum, row) => sum + row[j]!, 0) / (b - a)
    expect([mean(0, 200), mean(220, 400), mean(420, 700)].map((value) => value.toFixed(1))).toEqual([
      '6.2',
      '5.6',
      '6.2',
    ])
    expect(
      stationEvents(2)
        .filter(({ what }) => what === 'fouling')
        .map(({ from }) => from),
    ).toEqual([1800, 7200])
  })
})
