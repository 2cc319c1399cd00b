import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { FrameMaker, type FrameOptions } from '../../src/frames/frame-maker.ts'
import { Random } from '../support/random.ts'
import { Feeder, plainOptions, present, type Reading } from './feed.ts'

const start = 1_000_000_000_000
const second = 1000
const names = ['a', 'b', 'c', 'd']

/** Fat-tailed walks with a common part, holes, silences, repeats and disorder; one to three readings a step. */
function wildReadings(seed: number, steps: number): Reading[] {
  const random = new Random(seed)
  const level = [100, 100, 100, 100]
  const readings: Reading[] = []
  let time = start
  for (let k = 0; k < steps; k++) {
    time += random.uniform() < 0.01 ? 40 * second : 300 + 900 * random.uniform()
    const common = random.fatTailed()
    for (const [i, name] of names.entries()) {
      if (random.uniform() < 0.1) continue
      level[i] = level[i]! * Math.exp(0.001 * (common + random.fatTailed()))
      const reading: Reading = [name, time + Math.floor(200 * random.uniform()), level[i]!]
      readings.push(reading)
      if (random.uniform() < 0.02) readings.push(reading)
    }
  }
  return readings
}

/** As many of them for these options: with `row` the readings of a second share its time stamp, as in a table. */
function wildReadingsFor({ step }: Partial<FrameOptions>, seed: number, steps: number): Reading[] {
  const readings = wildReadings(seed, steps)
  if (step !== 'row') return readings
  return readings.map(([name, time, value]) => [name, time - (time % second), value])
}

const kinds: readonly [string, Partial<FrameOptions>][] = [
  ['plain log-returns', { increment: 'log-return' }],
  ['scaled', { commonVolatility: 'remove', truncateAt: 4, scaleSpan: 50 }],
  ['prewhitened levels', { increment: 'level', memory: 'prewhiten', fitOver: 60, truncateAt: 4 }],
  ['effective sample', { memory: 'effective-sample', truncateAt: 3 }],
  ['covariance', { commonVolatility: 'keep', truncateAt: 5, scaleFixedAfter: 40 }],
  ['rows', { step: 'row', lateness: 400, memory: 'prewhiten', fitOver: 60 }],
  [
    'sessions',
    {
      sessions: { zone: 'Europe/Oslo', open: '03:50', close: '03:48', days: 'mon-sun', holidays: [] },
      truncateAt: 4,
    },
  ],
]

describe('a snapshot goes on bit for bit', () => {
  test.each(kinds)('%s', (_, options) => {
    const readings = wildReadingsFor(options, 5, 1500)
    const through = new Feeder(options).take(readings).end()
    expect(through.frames.length).toBeGreaterThan(300)
    const random = new Random(6)
    let stages = new Feeder(options)
    const frames = []
    const findings = []
    for (let k = 0; k < readings.length; ) {
      const size = 1 + random.below(700)
      stages.take(readings.slice(k, k + size))
      k += size
      frames.push(...stages.frames)
      findings.push(...stages.findings)
      // The very maker that has gone on must not be needed: a fresh one, from a copy.
      const maker = new FrameMaker({ ...plainOptions, ...options })
      maker.restore(structuredClone(stages.maker.snapshot()))
      stages = new Feeder({}, maker)
    }
    stages.end()
    expect([...frames, ...stages.frames]).toEqual(through.frames)
    expect([...findings, ...stages.findings]).toEqual(through.findings)
    expect(stages.maker.effectiveShare).toBe(through.maker.effectiveShare)
    expect(stages.maker.stepComparison).toEqual(through.maker.stepComparison)
    expect(stages.maker.conditions).toEqual(through.maker.conditions)
  })

  test('also into a maker that has already gone another way', () => {
    const readings = wildReadings(7, 300)
    const half = readings.length >> 1
    const through = new Feeder().take(readings).end()
    const first = new Feeder().take(readings.slice(0, half))
    const other = new Feeder().take([...names].reverse().map((name): Reading => [name, start, 1]))
    other.maker.restore(structuredClone(first.maker.snapshot()))
    other.frames.length = 0
    other.take(readings.slice(half)).end()
    expect([...first.frames, ...other.frames]).toEqual(through.frames)
  })
})

describe('scaled frames do not depend on batches, order or interleaving', () => {
  test.each(kinds)('%s', (_, options) => {
    const lateness = 700
    const inOrder = wildReadingsFor(options, 9, 700).sort((a, b) => a[1] - b[1])
    const one = new Feeder({ ...options, lateness }).take(inOrder).end()
    expect(one.frames.length).toBeGreaterThan(100)
    fc.assert(
      fc.property(fc.integer({ min: 1, max: 1_000_000 }), (seed) => {
        const random = new Random(seed)
        const delayed = inOrder
          .map((reading) => ({ reading, arrival: reading[1] + lateness * random.uniform() }))
          .sort((a, b) => a.arrival - b.arrival)
          .map(({ reading }) => reading)
        const sources = ['p', 'q', 'r']
        const home = names.map(() => random.below(3))
        const queues = sources.map((_, s) => delayed.filter(([name]) => home[names.indexOf(name)] === s))
        const many = new Feeder({ ...options, lateness })
        many.note(many.maker.assign(sources, present))
        while (queues.some((queue) => queue.length > 0)) {
          const s = random.below(3)
          const some = queues[s]!.splice(0, 1 + random.below(60))
          if (some.length > 0) many.take(some, sources[s]!)
          if (queues[s]!.length === 0) many.end(sources[s]!)
        }
        expect(many.maker.names).toEqual(one.maker.names)
        expect(many.frames).toEqual(one.frames)
        expect(many.dropped.late ?? 0).toBe(0)
      }),
      { numRuns: 12, seed: 77 },
    )
  })
})

describe('what cannot be used', () => {
  test('is dropped under its reason, and never reaches a frame or a finding', () => {
    const feeder = new Feeder({ increment: 'log-return', signals: { names: ['a', 'b'] } })
      .take([
        ['a', Number.NaN, 1],
        ['a', Number.POSITIVE_INFINITY, 1],
        ['a', Number.NEGATIVE_INFINITY, 1],
        ['a', Date.UTC(1899, 11, 31), 1],
        ['a', Date.UTC(2201, 0, 1), 1],
        ['a', present + 2 * 86_400_000, 1],
        ['a', start, Number.NaN],
        ['a', start, Number.POSITIVE_INFINITY],
        ['a', start, 0],
        ['a', start, -1],
        ['nobody', start, 1],
        ['nobody', Number.NaN, Number.NaN],
        ['a', start, 10],
        ['a', start + second, 11],
      ])
      .end()
    expect(feeder.dropped).toEqual({ 'bad-time': 5, ahead: 1, 'bad-value': 2, 'not-positive': 2 })
    expect(feeder.table).toEqual([
      { time: start + 2 * second, increments: { a: expect.closeTo(Math.log(1.1), 14) } },
    ])
  })

  test('whatever numbers come in, all that goes out is finite, and its squares too', () => {
    const anything = fc.double()
    const nearNow = fc.integer({ min: start, max: start + 40_000 })
    const reading = fc.tuple(
      fc.constantFrom(...names),
      fc.oneof({ weight: 12, arbitrary: nearNow }, { weight: 1, arbitrary: anything }),
      fc.oneof(anything, fc.integer({ min: -9, max: 9 }), fc.constantFrom(1e308, -1e308, 1e-320)),
    )
    fc.assert(
      fc.property(
        fc.array(reading, { maxLength: 300 }),
        fc.constantFrom(...kinds),
        (readings, [, options]) => {
          const feeder = new Feeder({ ...options, lateness: 40_000 }).take(readings)
          feeder.note(feeder.maker.flush())
          for (const frame of feeder.frames) {
            let count = 0
            for (const array of [frame.increments, frame.scaled, frame.cleaned]) {
              expect(array).toHaveLength(frame.present.length)
              for (const [i, x] of array.entries()) {
                expect(Number.isFinite(x * x)).toBe(true)
                if (frame.present[i] === 0) expect(x).toBe(0)
              }
            }
            for (const has of frame.present) count += has
            expect(frame.missing).toBe(frame.present.length - count)
            expect(Number.isFinite(frame.time) && Number.isFinite(frame.volatility)).toBe(true)
          }
          for (const { from, to } of feeder.findings) {
            expect(Number.isFinite(from)).toBe(true)
            if (to !== null) expect(to).toBeGreaterThanOrEqual(from)
          }
        },
      ),
      { numRuns: 150, seed: 13 },
    )
  })
})

describe('sources', () => {
  test('with rows, files that are read one behind the other lose nothing, and the first one is held', () => {
    const rows = 400
    const feeder = new Feeder({ step: 'row', lateness: 0, signals: { names: ['a', 'b'] } })
    feeder.note(feeder.maker.assign(['first', 'second'], present))
    const table = (name: string): Reading[] =>
      Array.from({ length: rows }, (_, k): Reading => [name, start + k * 86_400_000, 1 + (k % 7)])
    feeder.take(table('a'), 'first')
    expect(feeder.frames).toHaveLength(0)
    expect(feeder.maker.pendingReadings).toBe(rows)
    expect(new Map(feeder.maker.leads(present))).toEqual(
      new Map([
        ['first', rows - 1],
        ['second', 0],
      ]),
    )
    feeder.take(table('b'), 'second').end('first', 'second')
    expect(feeder.frames).toHaveLength(rows - 1)
    expect(feeder.frames.every(({ missing }) => missing === 0)).toBe(true)
    expect(feeder.dropped).toEqual({})
    expect(feeder.maker.pending).toBe(0)
  })

  test('the slowest source is never ahead, so that holding the others cannot lock all', () => {
    const feeder = new Feeder({ lateness: 500 * second })
    feeder.note(feeder.maker.assign(['slow', 'fast'], present))
    const stretch = (name: string, seconds: number): Reading[] =>
      Array.from({ length: seconds }, (_, k): Reading => [name, start + k * second, k])
    feeder.take(stretch('a', 3000), 'fast')
    expect(Object.fromEntries(feeder.maker.leads(present))).toEqual({ slow: 0, fast: 2999 })
    feeder.take(stretch('b', 1000), 'slow')
    expect(Object.fromEntries(feeder.maker.leads(present))).toEqual({ slow: 0, fast: 2000 })
  })

  test('frames go on while only unwatched signals speak, as long as a value is fresh', () => {
    const feeder = new Feeder({ signals: { names: ['a'] }, staleAfter: 3 * second })
    feeder.take([
      ['a', start, 1],
      ['a', start + second, 2],
      ['other', start + 30 * second, 5],
    ])
    expect(feeder.frames.map(({ time }) => (time - start) / second)).toEqual([2, 3, 4])
    // And what is behind that clock is late, whether frames were made there or not.
    feeder.take([['a', start + 10 * second, 9]])
    expect(feeder.dropped).toEqual({ late: 1 })
  })

  test('which source ends last makes no difference, though one goes on with signals that nobody watches', () => {
    const outcomes = [
      ['p', 'q'],
      ['q', 'p'],
    ].map((order) => {
      const feeder = new Feeder({ signals: { names: ['a'] } })
      feeder.note(feeder.maker.assign(['p', 'q'], present))
      feeder.take(
        [
          ['a', start, 1],
          ['a', start + second, 2],
        ],
        'p',
      )
      feeder.take([['other', start + 8 * second, 1]], 'q')
      return feeder.end(...order).frames.map(({ time }) => (time - start) / second)
    })
    expect(outcomes[0]).toEqual(outcomes[1])
    expect(outcomes[0]).toEqual([2, 3, 4, 5, 6, 7])
  })

  test('readings that come after all sources had ended are taken up again after assignment', () => {
    const feeder = new Feeder({ lateness: 2 * second })
    feeder
      .take([
        ['a', start, 1],
        ['a', start + second, 2],
      ])
      .end()
    feeder.note(feeder.maker.assign(['a'], present))
    feeder
      .take([
        ['a', start + 3 * second, 4],
        ['a', start + 2 * second, 3],
      ])
      .end()
    expect(feeder.table.map(({ increments }) => increments.a)).toEqual([1, 1, 1])
    expect(feeder.dropped).toEqual({})
  })
})

describe('frames', () => {
  test('count from 0 at the first that is fit for a window: 20 increments of scale are behind it', () => {
    const random = new Random(3)
    const readings = Array.from({ length: 60 }, (_, k) =>
      names.map((name): Reading => [name, start + k * second, random.normal()]),
    ).flat()
    const feeder = new Feeder({ truncateAt: 5 }).take(readings).end()
    expect(feeder.frames[0]).toMatchObject({ index: 0, time: start + 22 * second, missing: 0 })
    expect(feeder.frames).toHaveLength(39)
  })

  test('the first frame has a scale for at least half of the signals that move', () => {
    const random = new Random(3)
    const readings = Array.from({ length: 60 }, (_, k) =>
      names
        .filter((name) => name === 'a' || k >= 15)
        .map((name): Reading => [name, start + k * second, random.normal()]),
    ).flat()
    const feeder = new Feeder({ truncateAt: 5 }).take(readings).end()
    // a alone would be ready in the step that ends at 22 s; the others begin 15 s later.
    expect(feeder.frames[0]).toMatchObject({ index: 0, time: start + 37 * second, missing: 0 })
  })

  test('level is taken from its own exponential mean before the step', () => {
    const levels = [5, 6, 8, 7]
    const readings = levels.map((v, k): Reading => ['a', start + k * second, v])
    const feeder = new Feeder({ increment: 'level', levelSpan: 3 }).take(readings).end()
    // Pull 2/(3+1) = 1/2; means before each step: 5, then 5.5, then 6.75.
    expect(feeder.frames.map(({ increments }) => increments[0])).toEqual([1, 2.5, 0.25])
  })

  test('plain frames hold the same numbers in increments, scaled and cleaned', () => {
    const feeder = new Feeder({ increment: 'log-return' }).take(wildReadings(4, 200)).end()
    for (const { increments, scaled, cleaned } of feeder.frames) {
      expect(scaled).toEqual(increments)
      expect(cleaned).toEqual(increments)
    }
  })

  test('a bad clock cannot make what waits grow: neither steps nor places', () => {
    const feeder = new Feeder({ signals: { pattern: '*', limit: 50 } })
    feeder.note(feeder.maker.assign(['good', 'bad'], present))
    feeder.take([['a', start, 1]], 'good')
    const random = new Random(2)
    for (let round = 0; round < 26; round++) {
      feeder.take(
        Array.from(
          { length: 5000 },
          (_, k): Reading => [`s${random.below(60)}`, start + (round * 5000 + k) * 3600 * second, 1],
        ),
        'bad',
      )
    }
    expect(feeder.maker.pending).toBeLessThanOrEqual(100_000)
    expect(feeder.maker.conditions.missing).toBeLessThanOrEqual(50)
    expect(feeder.dropped.ahead).toBeGreaterThan(0)
    expect(feeder.dropped['too-many-signals']).toBeGreaterThan(0)
  })
})
