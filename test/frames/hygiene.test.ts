import { describe, expect, test } from 'vitest'
import type { FrameOptions } from '../../src/frames/frame-maker.ts'
import { Hygiene } from '../../src/frames/hygiene.ts'
import { Random } from '../support/random.ts'
import { Feeder, type Reading } from './feed.ts'

const start = 1_000_000_000_000
const second = 1000

/** One reading a second of each signal, `level(signal, k)`; null: none. */
function feed(
  options: Partial<FrameOptions>,
  seconds: number,
  level: (signal: string, k: number) => number | null,
): Feeder {
  const readings: Reading[] = []
  for (let k = 0; k < seconds; k++) {
    for (const signal of ['a', 'b', 'c']) {
      const value = level(signal, k)
      if (value !== null) readings.push([signal, start + k * second, value])
    }
  }
  return new Feeder({ signals: { names: ['a', 'b', 'c'] }, ...options }).take(readings)
}

/** A level that moves at every step. */
const moving = (k: number): number => Math.sin(k) * 10 + k / 7
const at = (k: number): number => start + k * second
const of = (feeder: Feeder, kind: string) =>
  feeder.findings
    .filter(({ finding }) => finding === kind)
    .map(({ signal, from, to }) => [signal, from, to] as const)

describe('stuck', () => {
  test('a transmitter that repeats exactly the same reading is found, missing while it lasts, and released', () => {
    const feeder = feed({}, 400, (signal, k) => moving(signal === 'a' && k >= 100 && k < 300 ? 100 : k))
    // It last moved in the step that ends at 101 s; 60 unmoved steps are allowed.
    expect(of(feeder, 'stuck')).toEqual([
      ['a', at(101), null],
      ['a', at(101), at(301)],
    ])
    const missing = feeder.frames.filter(({ present }) => present[0] === 0).map(({ time }) => time)
    // From the 61st unmoved step on; and the first step that moves again has no level before it.
    expect(missing).toEqual(Array.from({ length: 301 - 162 + 1 }, (_, k) => at(162 + k)))
    expect(feeder.frames.every(({ present }) => present[1] === 1)).toBe(true)
  })

  test('a signal that often rests is given eight times its longest rest', () => {
    const resting = (k: number): number => Math.floor(k / 20)
    const steady = feed({}, 600, (_, k) => resting(k))
    expect(of(steady, 'stuck')).toEqual([])
    const stuck = feed({}, 900, (signal, k) => resting(signal === 'a' ? Math.min(k, 600) : k))
    expect(of(stuck, 'stuck').map(([signal]) => signal)).toEqual(['a'])
    // It moved last at 600; its longest rest is 19 further steps, so 152 are allowed.
    const noticed = stuck.frames.find(({ present }) => present[0] === 0)!.time
    expect(noticed).toBe(at(601 + 8 * 19 + 1))
  })

  test('the lull of a slow instrument is none, though every reading of it repeats the price', () => {
    // It trades every 9 s or so, and every 30 s or so over a lull of 40 min; then it dies.
    const random = new Random(20)
    let price = 100
    let next = 0
    const feeder = feed({ staleAfter: 120 * second }, 9000, (signal, k) => {
      if (signal !== 'a') return moving(k)
      if (k >= next && k < 6000) {
        price += random.normal()
        next = k + 1 + Math.floor(-(k >= 2000 && k < 4400 ? 30 : 9) * Math.log(1 - random.uniform()))
      }
      return price
    })
    const found = of(feeder, 'stuck')
    expect(found.map(([signal, , to]) => [signal, to])).toEqual([['a', null]])
    expect(found[0]![1]).toBeGreaterThan(at(5800))
  })

  test('stuck-after sets the time instead', () => {
    const feeder = feed({ stuckAfter: 10 * second }, 60, (signal, k) =>
      moving(signal === 'b' ? Math.min(k, 20) : k),
    )
    expect(of(feeder, 'stuck')).toEqual([['b', at(21), null]])
    expect(feeder.frames.find(({ present }) => present[1] === 0)!.time).toBe(at(21 + 11))
  })

  test('a signal that never moved at all is found as well', () => {
    const feeder = feed({}, 700, (signal, k) => (signal === 'c' ? 42 : moving(k)))
    expect(of(feeder, 'stuck')).toEqual([['c', at(1), null]])
    // Too young to know its rests, it is given eight times 60 unmoved steps.
    expect(feeder.frames.find(({ present }) => present[2] === 0)!.time).toBe(at(1 + 480 + 1))
  })

  test('a night between two equal prices is no standstill', () => {
    const sessions = { zone: 'Europe/Oslo', open: '09:00', close: '16:20', days: 'mon-sun', holidays: [] }
    const day = 86_400_000
    const morning = Date.parse('2026-06-01T08:00:00Z')
    const readings = [0, 1, 2].flatMap((d) =>
      Array.from({ length: 100 }, (_, k): Reading[] => [
        ['a', morning + d * day + k * second, k === 0 || k === 99 ? 7 : moving(k)],
        ['b', morning + d * day + k * second, moving(k)],
      ]).flat(),
    )
    const feeder = new Feeder({ sessions, stuckAfter: 3_600_000 }).take(readings)
    expect(of(feeder, 'stuck')).toEqual([])
  })
})

describe('stale', () => {
  test('begins when the last value has grown too old, from its own time on, and ends with the next', () => {
    const feeder = feed({ staleAfter: 5 * second }, 60, (signal, k) =>
      signal === 'b' && k >= 20 && k < 40 ? null : moving(k),
    )
    expect(of(feeder, 'stale')).toEqual([
      ['b', at(19), null],
      ['b', at(19), at(41)],
    ])
    const missing = feeder.frames.filter(({ present }) => present[1] === 0).map(({ time }) => time)
    expect(missing[0]).toBe(at(25))
    expect(missing.at(-1)).toBe(at(41))
  })

  test('a signal of the list that never speaks is stale once it had time to', () => {
    const feeder = feed({ staleAfter: 5 * second }, 30, (signal, k) => (signal === 'c' ? null : moving(k)))
    expect(of(feeder, 'stale')).toEqual([['c', at(1), null]])
    expect(feeder.maker.conditions).toEqual({ well: 2, missing: 1, stuck: 0, stale: 0, clipped: 0 })
  })

  test('one hole in a table is no finding, twelve rows in a row are', () => {
    const row = { step: 'row', lateness: 0 } as const
    expect(
      of(
        feed(row, 60, (s, k) => (s === 'a' && k === 30 ? null : moving(k))),
        'stale',
      ),
    ).toEqual([])
    expect(
      of(
        feed(row, 60, (s, k) => (s === 'a' && k >= 30 && k < 41 ? null : moving(k))),
        'stale',
      ),
    ).toEqual([])
    const twelve = feed(row, 60, (s, k) => (s === 'a' && k >= 30 && k < 42 ? null : moving(k)))
    expect(of(twelve, 'stale').map(([signal, from]) => [signal, from])).toEqual([
      ['a', at(29)],
      ['a', at(29)],
    ])
    const long = feed(row, 60, (s, k) => (s === 'a' && k >= 30 && k < 45 ? null : moving(k)))
    expect(of(long, 'stale')).toEqual([
      ['a', at(29), null],
      ['a', at(29), at(45)],
    ])
  })
})

describe('gap', () => {
  test('is a silence of the ensemble, with its beginning and end', () => {
    const feeder = feed({ staleAfter: 2 * second }, 100, (_, k) => (k >= 30 && k < 60 ? null : moving(k)))
    // Values of 29 s are fresh for two seconds: the frames go on to 31 s.
    expect(of(feeder, 'gap')).toEqual([[null, at(31), at(60)]])
  })

  test('the first frame after it has no increments', () => {
    const feeder = feed({ staleAfter: 2 * second }, 100, (_, k) => (k >= 30 && k < 60 ? null : 5 * k))
    expect(feeder.frames.map(({ time }) => time)).not.toContain(at(61))
    for (const { increments } of feeder.frames) expect([0, 5]).toContain(increments[0])
  })
})

describe('clipped', () => {
  /** Normal steps; from 1000 to 1600 every seventh one of signal a is forty times as large. */
  function spiky(): Feeder {
    const random = new Random(17)
    const level = [0, 0, 0]
    return feed({ commonVolatility: 'keep', truncateAt: 5 }, 3000, (signal, k) => {
      const i = 'abc'.indexOf(signal)
      const wild = i === 0 && k >= 1000 && k < 1600 && k % 7 === 0
      level[i] = level[i]! + (wild ? 40 : 1) * random.normal()
      return level[i]!
    })
  }

  test('a signal clipped far more often than 1/K² is one finding, that ends when it is well again', () => {
    const found = of(spiky(), 'clipped')
    expect(found.map(([signal, , to]) => [signal, to === null])).toEqual([
      ['a', true],
      ['a', false],
    ])
    const [, from, to] = found[1]!
    expect(from).toBeGreaterThan(at(1000))
    expect(from).toBeLessThan(at(1200))
    expect(to).toBeGreaterThan(at(1600))
    expect(to).toBeLessThan(at(1900))
  })

  test('what is far more often for one signal is no news for one whose own history is that', () => {
    // K = 5: 1/K² is 0.04. a is clipped in 1 of 16 frames from the start, b but once; then both in 1 of 8.
    const hygiene = new Hygiene(
      { stuckAfter: null, staleAfter: null, truncateAt: 5 },
      (place) => 'ab'[place]!,
    )
    hygiene.reserve(2)
    const every = (frames: number, a: number, b: number): void => {
      for (let k = 0; k < frames; k++)
        hygiene.clipped(Uint8Array.of(1, 1), Uint8Array.of(k % a === 0 ? 1 : 0, k % b === 0 ? 1 : 0), at(k))
    }
    every(10_000, 16, Number.POSITIVE_INFINITY)
    hygiene.news()
    every(2000, 8, 8)
    expect(hygiene.news().map(({ signal, finding, to }) => [signal, finding, to])).toEqual([
      ['b', 'clipped', null],
    ])
  })

  test('one flash print is none', () => {
    const random = new Random(18)
    const level = [0, 0, 0]
    const feeder = feed({ commonVolatility: 'keep', truncateAt: 5 }, 500, (signal, k) => {
      const i = 'abc'.indexOf(signal)
      level[i] = level[i]! + random.normal() + (i === 1 && k === 300 ? 1000 : 0)
      return level[i]!
    })
    expect(feeder.frames.some(({ clipped }) => clipped === 1)).toBe(true)
    expect(of(feeder, 'clipped')).toEqual([])
  })
})

describe('duplicate and out-of-order', () => {
  /** Readings of a come twice, or swapped by pairs, in [100, 400). */
  function disorderly(how: 'twice' | 'swapped'): Feeder {
    const readings: Reading[] = []
    for (let k = 0; k < 900; k++) {
      const wild = k >= 100 && k < 400
      const first: Reading = ['a', at(k), moving(k)]
      const second: Reading = ['a', at(k) + 400, moving(k + 0.4)]
      readings.push(...(wild && how === 'swapped' ? [second, first] : [first, second]))
      if (wild && how === 'twice') readings.push(first, second)
      readings.push(['b', at(k), moving(k)])
    }
    return new Feeder({ signals: { names: ['a', 'b'] } }).take(readings)
  }

  test.each([
    ['twice', 'duplicate'],
    ['swapped', 'out-of-order'],
  ] as const)('readings that come %s are a finding: one that begins and one that ends', (how, kind) => {
    const feeder = disorderly(how)
    const found = of(feeder, kind)
    expect(found.map(([signal, , to]) => [signal, to === null])).toEqual([
      ['a', true],
      ['a', false],
    ])
    expect(found[1]![1]).toBeGreaterThan(at(100))
    expect(found[1]![2]).toBeGreaterThan(at(400))
    expect(found[1]![2]).toBeLessThan(at(900))
  })

  test('disorder across steps is seen, and is no loss within the lateness', () => {
    const readings: Reading[] = []
    for (let k = 0; k < 600; k += 2)
      readings.push(['a', at(k + 1), moving(k + 1)], ['a', at(k), moving(k)], ['b', at(k), moving(k)])
    const feeder = new Feeder({ signals: { names: ['a', 'b'] }, lateness: 2000 }).take(readings).end()
    expect(of(feeder, 'out-of-order')).toEqual([['a', expect.any(Number), null]])
    expect(feeder.dropped).toEqual({})
    expect(feeder.frames).toHaveLength(599)
  })

  test('a duplicate now and then is counted and no finding', () => {
    const readings: Reading[] = []
    for (let k = 0; k < 500; k++) {
      readings.push(['a', at(k), moving(k)])
      if (k % 20 === 0) readings.push(['a', at(k), moving(k)])
    }
    const feeder = new Feeder().take(readings)
    expect(feeder.dropped).toEqual({ duplicate: 25 })
    expect(feeder.findings).toEqual([])
  })
})

test('at most one finding of a kind is open for a signal, whatever the data do', () => {
  const random = new Random(19)
  const feeder = feed({ staleAfter: 3 * second, truncateAt: 3, commonVolatility: 'remove' }, 3000, (_, k) =>
    random.uniform() < 0.3
      ? null
      : random.uniform() < 0.3
        ? 7
        : random.normal() ** 5 + (k % 300 < 200 ? 0 : k),
  )
  const open = new Set<string>()
  for (const { signal, finding, to } of feeder.findings) {
    if (finding === 'gap') continue
    const key = `${signal}/${finding}`
    expect(open.has(key)).toBe(to !== null)
    if (to === null) open.add(key)
    else open.delete(key)
  }
  expect(feeder.findings.length).toBeGreaterThan(0)
})
