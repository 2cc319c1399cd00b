import { beforeAll, describe, expect } from 'vitest'
import { marchenkoPasturEdges } from '../../src/bulk/marchenko-pastur.ts'
import { type OpenDataId, testWithOpenData } from '../support/open-data.ts'
import { type FrameRecord, replayTable } from './support/replay-table.ts'

/**
 * Figures of the project's table of check values (numpy, recomputed by an independent program): log returns
 * dated by the later close, Pearson correlation over a boxcar of T rows, W2 and its ceiling against the
 * window that ended T rows earlier. All to four printed decimals.
 */
interface Figures {
  readonly data: OpenDataId
  readonly T: number
  readonly edge: number
  readonly share: {
    readonly mean?: number
    readonly median?: number
    readonly max: Dated
    readonly min: Dated
  }
  readonly meanW2?: number
  readonly meanCounts?: readonly [number, number]
  readonly days: readonly Day[]
  /** Largest upward jumps of the share from one day to the next, largest first. */
  readonly jumps: readonly Dated[]
  /** Falls of the share exactly T rows after a jump: the crash leaves the window. */
  readonly ghosts?: readonly Dated[]
  readonly w2Peaks?: readonly Dated[]
}

type Dated = readonly [date: string, value: number]

interface Day {
  readonly date: string
  readonly share?: number
  readonly lambda1?: number
  readonly w2?: number
  readonly ceiling?: number
  /** Eigenvalues above the edge with σ² = 1 and with σ² = 1 − λ1/N. */
  readonly counts?: readonly [number, number]
}

const tables: readonly Figures[] = [
  {
    data: 'dj30',
    T: 100,
    edge: 2.3954,
    share: { mean: 0.2657, median: 0.2515, max: ['1997-12-30', 0.5027], min: ['1993-12-23', 0.1258] },
    meanW2: 0.4219,
    meanCounts: [1.4256, 2.6068],
    days: [
      { date: '1991-05-23', share: 0.405, lambda1: 12.1514 },
      { date: '1997-12-30', lambda1: 15.0818 },
      { date: '2001-01-02', share: 0.1927, lambda1: 5.7805, counts: [2, 2], w2: 0.1016, ceiling: 0.8237 },
      { date: '1997-10-27', share: 0.4694, lambda1: 14.0829, counts: [1, 3], w2: 0.7486, ceiling: 1.0901 },
      { date: '1998-08-31', share: 0.3912, lambda1: 11.7374, w2: 0.5942, ceiling: 0.9382 },
      { date: '1991-11-15', share: 0.373 },
    ],
    jumps: [
      ['1997-10-27', 0.0834],
      ['1998-08-31', 0.0692],
      ['1991-11-15', 0.0569],
    ],
    ghosts: [
      ['1998-03-23', -0.0836],
      ['1999-01-25', -0.0425],
      ['1992-04-09', -0.0433],
    ],
  },
  {
    data: 'dj30',
    T: 250,
    edge: 1.8128,
    share: { mean: 0.2601, max: ['1998-10-02', 0.4141], min: ['1994-03-23', 0.1582] },
    days: [{ date: '1997-10-27', share: 0.3792, w2: 0.6733, ceiling: 0.876, counts: [1, 3] }],
    jumps: [['1997-10-27', 0.0413]],
  },
  {
    data: 'sp20',
    T: 100,
    edge: 2.0944,
    share: { mean: 0.3531, max: ['2020-03-17', 0.7419], min: ['2000-09-29', 0.1383] },
    meanCounts: [1.4923, 2.9616],
    days: [
      { date: '2020-03-17', lambda1: 14.8374 },
      { date: '2018-02-05', share: 0.3259 },
      { date: '2011-08-08', share: 0.5445 },
      { date: '1998-08-31', share: 0.4086 },
      { date: '2020-03-16', share: 0.7328, w2: 1.6003, ceiling: 1.7564 },
    ],
    jumps: [
      ['2018-02-05', 0.1204],
      ['2011-08-08', 0.0723],
      ['1998-08-31', 0.0715],
      ['2020-02-27', 0.0644],
      ['1997-10-27', 0.0641],
    ],
    w2Peaks: [
      ['2020-06-15', 1.9644],
      ['2011-09-26', 1.8186],
    ],
  },
  {
    data: 'sp20',
    T: 250,
    edge: 1.6457,
    share: { mean: 0.3543, max: ['2020-04-08', 0.6311], min: ['2017-11-07', 0.1587] },
    days: [{ date: '2018-02-05', share: 0.2614 }],
    jumps: [['2018-02-05', 0.0639]],
  },
]

const mean = (values: readonly number[]): number => values.reduce((sum, v) => sum + v, 0) / values.length
const to4 = (value: number): number => Number(value.toFixed(4))
const day = (record: FrameRecord): string => record.time.slice(0, 10)

const extreme = (records: readonly FrameRecord[], better: (a: number, b: number) => boolean): Dated => {
  const best = records.reduce((kept, r) => (better(r.share!, kept.share!) ? r : kept))
  return [day(best), to4(best.share!)]
}

describe.each(tables)('replay --json of $data with T = $T', (figures) => {
  const replayed = new Map<OpenDataId, readonly FrameRecord[]>()

  const withRecords = (title: string, check: (records: readonly FrameRecord[], n: number) => void) =>
    testWithOpenData(figures.data, title, async (table) => {
      if (!replayed.has(figures.data)) replayed.set(figures.data, await replayTable(table, figures.T))
      const records = replayed.get(figures.data)!.filter(({ share }) => share !== null)
      check(records, table.signals.length)
    })

  beforeAll(() => replayed.clear())

  withRecords('has the leading share of every stated day', (records, n) => {
    for (const expected of figures.days) {
      const found = records.find((record) => day(record) === expected.date)!
      if (expected.share !== undefined)
        expect([expected.date, to4(found.share!)]).toEqual([expected.date, expected.share])
      if (expected.lambda1 !== undefined)
        expect([expected.date, to4(found.leading[0]!)]).toEqual([expected.date, expected.lambda1])
      if (expected.w2 !== undefined)
        expect([expected.date, to4(found.distance!.w2)]).toEqual([expected.date, expected.w2])
      if (expected.ceiling !== undefined) {
        expect([expected.date, to4(found.distance!.ceiling)]).toEqual([expected.date, expected.ceiling])
      }
      if (expected.counts !== undefined) {
        expect([expected.date, ...countsAbove(found, n, figures.T)]).toEqual([
          expected.date,
          ...expected.counts,
        ])
      }
    }
  })

  withRecords('has its mean, median, largest and smallest share', (records) => {
    const shares = records.map(({ share }) => share!)
    if (figures.share.mean !== undefined) expect(to4(mean(shares))).toBe(figures.share.mean)
    if (figures.share.median !== undefined) {
      const sorted = [...shares].sort((a, b) => a - b)
      const h = sorted.length >> 1
      const median = sorted.length % 2 ? sorted[h]! : (sorted[h - 1]! + sorted[h]!) / 2
      expect(to4(median)).toBe(figures.share.median)
    }
    expect(extreme(records, (a, b) => a > b)).toEqual(figures.share.max)
    expect(extreme(records, (a, b) => a < b)).toEqual(figures.share.min)
  })

  withRecords('has the largest jumps of the share, and its ghosts T rows later', (records) => {
    const steps = records.slice(1).map((r, i): Dated => [day(r), r.share! - records[i]!.share!])
    const upward = [...steps].sort((a, b) => b[1] - a[1]).slice(0, figures.jumps.length)
    expect(upward.map(([date, step]) => [date, to4(step)])).toEqual(figures.jumps)
    for (const [date, step] of figures.ghosts ?? []) {
      expect([date, to4(steps.find(([d]) => d === date)![1])]).toEqual([date, step])
    }
  })

  withRecords('keeps W2 at or under its ceiling on every frame', (records) => {
    const distances = records.flatMap(({ distance }) => distance ?? [])
    expect(distances.length).toBe(records.length - figures.T)
    for (const { w2, ceiling } of distances) expect(w2).toBeLessThanOrEqual(ceiling + 1e-12)
    if (figures.meanW2 !== undefined) expect(to4(mean(distances.map(({ w2 }) => w2)))).toBe(figures.meanW2)
    for (const [date, w2] of figures.w2Peaks ?? []) {
      expect([date, to4(records.find((r) => day(r) === date)!.distance!.w2)]).toEqual([date, w2])
    }
  })

  withRecords('counts the eigenvalues beyond the edge as the table does', (records, n) => {
    expect(to4(marchenkoPasturEdges(n / figures.T, 1).upper)).toBe(figures.edge)
    if (figures.meanCounts === undefined) return
    const counts = records.map((record) => countsAbove(record, n, figures.T))
    // The table cuts 3463/2429 = 1.42569 to 1.4256, so its last digit is held loosely here.
    expect(Math.abs(mean(counts.map(([n1]) => n1)) - figures.meanCounts[0])).toBeLessThan(1e-4)
    expect(Math.abs(mean(counts.map(([, n2]) => n2)) - figures.meanCounts[1])).toBeLessThan(1e-4)
  })
})

/** At the function's level: the record's own edge is fitted by deflation, the table's is not. */
function countsAbove(record: FrameRecord, n: number, T: number): readonly [number, number] {
  const edge = (variance: number) => marchenkoPasturEdges(n / T, variance).upper
  const above = (limit: number) => record.leading.filter((value) => value > limit).length
  return [above(edge(1)), above(edge(1 - record.leading[0]! / n))]
}
