import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { FrameMaker } from '../../src/frames/frame-maker.ts'
import { Feeder, plainOptions, present, type Reading } from './feed.ts'

const signals = ['a', 'b', 'c', 'd']

/** Readings in event order over about 40 steps of a second, with ties, silences and out-of-grid times. */
const history = fc
  .array(
    fc.record({
      signal: fc.constantFrom(...signals),
      wait: fc.oneof(
        { weight: 9, arbitrary: fc.integer({ min: 0, max: 400 }) },
        { weight: 1, arbitrary: fc.integer({ min: 5000, max: 40_000 }) },
      ),
      value: fc.integer({ min: -50, max: 50 }),
    }),
    { minLength: 10, maxLength: 200 },
  )
  .map((steps) => {
    let time = 1_000_000_000_000
    return steps.map(({ signal, wait, value }): Reading => {
      time += wait
      return [signal, time, value]
    })
  })

/** An order of arrival in which no reading comes more than `lateness` behind the largest time before it. */
function delayed(readings: readonly Reading[], delays: readonly number[]): Reading[] {
  return readings
    .map((reading, k) => ({ reading, arrival: reading[1] + (delays[k % delays.length] ?? 0), k }))
    .sort((a, b) => a.arrival - b.arrival || a.k - b.k)
    .map(({ reading }) => reading)
}

const outcome = (feeder: Feeder) => ({ table: feeder.table, names: [...feeder.maker.names] })

describe('alignment', () => {
  test('takes the last value before the end of each step and carries it forward while it is fresh', () => {
    const feeder = new Feeder({ staleAfter: 2500 })
      .take([
        ['a', 100, 1],
        ['b', 200, 10],
        ['a', 900, 2],
        ['a', 1500, 5],
        ['a', 2500, 4],
        ['a', 3500, 3],
        ['a', 4500, 9],
      ])
      .end()
    expect(feeder.table).toEqual([
      { time: 2000, increments: { a: 3, b: 0 } },
      // b's value of 200 ms is older than 2500 ms at 3000: missing, neither 0 nor its old value.
      { time: 3000, increments: { a: -1 } },
      { time: 4000, increments: { a: -1 } },
      { time: 5000, increments: { a: 6 } },
    ])
  })

  test('frames do not depend on how readings are cut into batches', () => {
    fc.assert(
      fc.property(history, fc.array(fc.integer({ min: 1, max: 20 }), { minLength: 1 }), (readings, cuts) => {
        const whole = outcome(new Feeder().take(readings).end())
        const cut = new Feeder()
        for (let k = 0, c = 0; k < readings.length; c++) {
          const size = cuts[c % cuts.length]!
          cut.take(readings.slice(k, k + size))
          k += size
        }
        expect(outcome(cut.end())).toEqual(whole)
      }),
    )
  })

  test('frames do not depend on the order of readings within the allowed lateness', () => {
    fc.assert(
      fc.property(
        history,
        fc.array(fc.integer({ min: 0, max: 500 }), { minLength: 1 }),
        (readings, delays) => {
          const inOrder = new Feeder().take(readings).end()
          const shuffled = new Feeder().take(delayed(readings, delays)).end()
          expect(outcome(shuffled)).toEqual(outcome(inOrder))
          expect(shuffled.dropped.late ?? 0).toBe(0)
        },
      ),
    )
  })

  test('frames do not depend on how readings are spread over sources', () => {
    fc.assert(
      fc.property(
        history,
        fc.array(fc.integer({ min: 0, max: 2 }), { minLength: 4, maxLength: 4 }),
        fc.infiniteStream(fc.boolean()),
        (readings, place, coin) => {
          const one = outcome(new Feeder().take(readings).end())
          const many = new Feeder()
          many.note(many.maker.assign(['p0', 'p1', 'p2'], present))
          const queues = [0, 1, 2].map((p) =>
            readings.filter(([signal]) => place[signals.indexOf(signal)] === p),
          )
          while (queues.some((queue) => queue.length > 0)) {
            for (const [p, queue] of queues.entries()) {
              if (queue.length > 0 && coin.next().value) many.take([queue.shift()!], `p${p}`)
            }
          }
          expect(outcome(many.end('p0', 'p1', 'p2'))).toEqual(one)
        },
      ),
      { numRuns: 60 },
    )
  })

  test('a snapshot at any reading goes on bit for bit', () => {
    fc.assert(
      fc.property(history, fc.nat(), fc.boolean(), (readings, at, whitened) => {
        const cut = at % readings.length
        const options = {
          ...(whitened ? ({ memory: 'prewhiten', fitOver: 8 } as const) : {}),
          commonVolatility: 'remove',
          truncateAt: 3,
          scaleSpan: 10,
        } as const
        const through = new Feeder(options).take(readings).end()
        const before = new Feeder(options).take(readings.slice(0, cut))
        const maker = new FrameMaker({ ...plainOptions, ...options })
        maker.restore(structuredClone(before.maker.snapshot()))
        const after = new Feeder({}, maker).take(readings.slice(cut)).end()
        expect([...before.frames, ...after.frames]).toEqual(through.frames)
      }),
    )
  })

  test('a reading behind the closed step is counted late and never used', () => {
    const feeder = new Feeder().take([
      ['a', 500, 1],
      ['a', 1500, 2],
      ['a', 2600, 3],
      ['a', 900, 99],
    ])
    expect(feeder.dropped).toEqual({ late: 1 })
    expect(feeder.end().table.map(({ increments }) => increments)).toEqual([{ a: 1 }, { a: 1 }])
  })

  test('of two readings of one signal and time the larger counts, whichever comes first', () => {
    for (const values of [
      [7, 3],
      [3, 7],
    ]) {
      const feeder = new Feeder().take([
        ['a', 500, 1],
        ['a', 1500, values[0]!],
        ['a', 1500, values[1]!],
      ])
      expect(feeder.end().table).toEqual([{ time: 2000, increments: { a: 6 } }])
      expect(feeder.dropped).toEqual({ duplicate: 1 })
    }
  })

  test.each([0.1, 0.3, 1 / 3, 7.7, 1000])(
    'with steps of %d ms a reading at fractions of one is in its own',
    (step) => {
      // Times near and at multiples of the step; what is k·step in floating point begins step k.
      const multiple = fc.integer({ min: 1, max: 5000 })
      const near = fc.constantFrom<(time: number) => number>(
        (time) => time,
        (time) => time * (1 - Number.EPSILON / 2), // the next number below
        (time) => time * (1 + Number.EPSILON),
        (time) => time + 0.5 * step,
      )
      fc.assert(
        fc.property(multiple, near, (k, moved) => {
          const time = moved((k + 1) * step)
          const feeder = new Feeder({ step, lateness: 0 })
            .take([
              ['a', time - 1.5 * step, 1],
              ['a', time, 2],
            ])
            .end()
          const end = feeder.table.find(({ increments }) => increments.a === 1)!.time
          const key = Math.round(end / step)
          expect(end).toBe(key * step)
          expect(time).toBeLessThan(key * step)
          expect(time).toBeGreaterThanOrEqual((key - 1) * step)
        }),
        { seed: 8, numRuns: 200 },
      )
    },
  )

  test('step row makes every distinct time a frame, and a missing cell is missing', () => {
    const feeder = new Feeder({ step: 'row', lateness: 0 })
      .take([
        ['a', 10, 1],
        ['b', 10, 1],
        ['a', 20, 2],
        ['a', 25, 4],
        ['b', 25, 9],
        ['a', 40, 5],
        ['b', 40, 8],
      ])
      .end()
    expect(feeder.table).toEqual([
      { time: 20, increments: { a: 1 } },
      { time: 25, increments: { a: 2 } },
      { time: 40, increments: { a: 1, b: -1 } },
    ])
  })

  test('a jump over years of silence makes no frames and is a gap', () => {
    const year = 365 * 86_400_000
    const feeder = new Feeder()
      .take([
        ['a', 500, 1],
        ['a', 1500, 2],
        ['a', 20 * year, 3],
        ['a', 20 * year + 1000, 5],
      ])
      .end()
    expect(feeder.frames.length).toBeLessThan(20)
    expect(feeder.table.at(-1)).toEqual({ time: 20 * year + 2000, increments: { a: 2 } })
    expect(feeder.findings.filter(({ finding }) => finding === 'gap')).toHaveLength(1)
  })

  test('a clock far ahead of the present is dropped and does not drag the others away', () => {
    const feeder = new Feeder({ ahead: 60_000 })
      .take([['a', 500, 1]], 'a', 1000)
      .take([['b', 1_000_000_000, 5]], 'a', 1000)
      .take(
        [
          ['a', 1500, 2],
          ['a', 2500, 4],
        ],
        'a',
        2000,
      )
      .end()
    expect(feeder.dropped).toEqual({ ahead: 1 })
    expect(feeder.table.map(({ increments }) => increments)).toEqual([{ a: 1 }, { a: 2 }])
  })

  test('what waits stays bounded when one source runs away', () => {
    const feeder = new Feeder({ signals: { names: ['a', 'b'] } })
    feeder.note(feeder.maker.assign(['slow', 'fast'], present))
    feeder.take([['a', 0, 1]], 'slow')
    feeder.take(
      Array.from({ length: 150_000 }, (_, k): Reading => ['b', k * 1000, k]),
      'fast',
    )
    expect(feeder.maker.pending).toBeLessThanOrEqual(100_000)
    expect(feeder.dropped.ahead).toBe(50_000)
    expect(Object.fromEntries(feeder.maker.leads(present)).fast).toBeGreaterThan(100_000)
  })

  test('a source that is read up to its end and silent no longer holds the clock; one that is not does', () => {
    const feeder = new Feeder({ idleAfter: 1000 })
    feeder.note(feeder.maker.assign(['x', 'y'], 0))
    feeder.take(
      [
        ['a', 500, 1],
        ['a', 1500, 2],
        ['a', 5500, 3],
      ],
      'x',
      0,
    )
    feeder.note(feeder.maker.beat(5000))
    expect(feeder.frames).toHaveLength(0)
    feeder.note(feeder.maker.caughtUp('y', 5000))
    expect(feeder.frames.length).toBeGreaterThan(0)
  })

  test('log-returns refuse values at or below zero', () => {
    const feeder = new Feeder({ increment: 'log-return' }).take([
      ['a', 500, 100],
      ['a', 1500, -5],
      ['a', 1600, 0],
      ['a', 1700, 110],
    ])
    expect(feeder.dropped).toEqual({ 'not-positive': 2 })
    expect(feeder.end().table[0]!.increments.a).toBeCloseTo(Math.log(1.1), 14)
  })

  test('a pattern takes in signals up to its limit, numbered by first frame and name', () => {
    const feeder = new Feeder({ signals: { pattern: 'S*', limit: 2 } }).take([
      ['S9', 100, 1],
      ['X1', 100, 1],
      ['S1', 200, 1],
      ['S5', 300, 1],
      ['S9', 1100, 2],
      ['S1', 1100, 2],
      ['S1', 2100, 2],
    ])
    expect(feeder.end().maker.names).toEqual(['S1', 'S9'])
    expect(feeder.dropped).toEqual({ 'too-many-signals': 1 })
  })

  test('nothing that is not finite leaves, whatever comes in', () => {
    const wild = fc.array(
      fc.tuple(
        fc.constantFrom('a', 'b', 'c'),
        fc.integer({ min: 0, max: 30_000 }),
        fc.oneof(
          fc.double({ noNaN: true, noDefaultInfinity: true }),
          fc.constantFrom(1e308, -1e308, 5e-324, 0),
        ),
      ),
      { maxLength: 120 },
    )
    fc.assert(
      fc.property(wild, fc.constantFrom('log-return', 'difference', 'level'), (readings, increment) => {
        const feeder = new Feeder({ increment, commonVolatility: 'remove', truncateAt: 3, scaleSpan: 30 })
        feeder.take([...readings].sort((x, y) => x[1] - y[1])).end()
        for (const { scaled, cleaned, increments, volatility } of feeder.frames) {
          for (const array of [scaled, cleaned, increments]) expect(array.every(Number.isFinite)).toBe(true)
          expect(Number.isFinite(volatility)).toBe(true)
        }
      }),
    )
  })
})
