import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { History } from '../../src/page/history.ts'
import type { Point } from '../../src/page/view.ts'

const point = (time: number, evidence: number | null = null): Point => [
  time,
  0.2,
  10,
  2,
  2.4,
  1,
  0.2,
  0.6,
  evidence,
]
const size = { points: 8, coarsest: 4 }

describe('the history of an ensemble', () => {
  it('keeps every frame while there is room', () => {
    const history = new History(size)
    for (let t = 0; t < 8; t++) history.push(point(t))
    expect(history.points.map(([time]) => time)).toEqual([0, 1, 2, 3, 4, 5, 6, 7])
    expect(history.stride).toBe(1)
  })

  it('lets one point stand for more frames when the room is used up, and lastly lets the oldest go', () => {
    const history = new History(size)
    for (let t = 0; t < 9; t++) history.push(point(t))
    expect(history.stride).toBe(2)
    expect(history.points.map(([time]) => time)).toEqual([1, 3, 5, 7])
    for (let t = 9; t < 400; t++) history.push(point(t))
    expect(history.stride).toBe(4)
    expect(history.points.length).toBe(8)
    expect(history.points.at(-1)?.[0]).toBe(399)
    expect(history.points[0]?.[0]).toBe(371)
  })

  it('never loses a peak of the evidence by thinning', () => {
    const history = new History(size)
    for (let t = 0; t < 30; t++) history.push(point(t, t === 5 ? 3 : 0.1))
    expect(history.points.some(([time, ...rest]) => time === 5 && rest.at(-1) === 3)).toBe(true)
  })

  it('holds frames that were judged, in order, within its bounds, whatever comes', () => {
    fc.assert(
      fc.property(fc.array(fc.option(fc.double({ min: 0, max: 3 })), { maxLength: 300 }), (evidence) => {
        const history = new History(size)
        const pushed = evidence.map((value, t) => point(t, value))
        for (const one of pushed) history.push(one)
        expect(history.points.length).toBeLessThanOrEqual(size.points)
        for (const kept of history.points) expect(pushed).toContain(kept)
        for (let i = 1; i < history.points.length; i++)
          expect(history.points[i]![0]).toBeGreaterThan(history.points[i - 1]![0])
      }),
      { seed: 7, numRuns: 60 },
    )
  })

  it('is the same at the other end when what it hands out is put together', () => {
    fc.assert(
      fc.property(
        fc.array(fc.integer({ min: 0, max: 30 }), { maxLength: 40 }),
        fc.integer({ min: 1, max: 9 }),
        (bursts, mostMore) => {
          const history = new History(size)
          let shown: readonly Point[] = []
          let t = 0
          for (const burst of bursts) {
            for (let k = 0; k < burst; k++) history.push(point(t++))
            const { more = [], whole } = history.taken(mostMore)
            expect(more.length).toBeLessThanOrEqual(mostMore)
            shown = (whole ?? [...shown, ...more]).slice(-size.points)
            expect(shown).toEqual(history.points)
          }
        },
      ),
      { seed: 11, numRuns: 60 },
    )
  })
})
