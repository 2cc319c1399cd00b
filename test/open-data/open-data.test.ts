import { EigenvalueDecomposition, Matrix } from 'ml-matrix'
import { expect } from 'vitest'
import { type OpenTable, sha256, sourceText, testWithOpenData } from '../support/open-data.ts'

/** Eigenvalues, largest first, of the Pearson correlation of rows `from` to `to` of a row-major table. */
function eigenvalues(values: Float64Array, signals: number, from: number, to: number): number[] {
  const rows = Matrix.from1DArray(to - from, signals, values.subarray(from * signals, to * signals))
  const scaled = rows.center('column').scale('column')
  const correlation = scaled
    .transpose()
    .mmul(scaled)
    .div(to - from - 1)
  return new EigenvalueDecomposition(correlation, { assumeSymmetric: true }).realEigenvalues.sort(
    (a, b) => b - a,
  )
}

/** Log returns, row-major, dated by the later row. */
function logReturns({ values, signals }: OpenTable): Float64Array {
  const n = signals.length
  return Float64Array.from({ length: values.length - n }, (_, i) => Math.log(values[i + n]! / values[i]!))
}

/** λ1/N of the window of T returns that ends on `date`. */
function shareOn(table: OpenTable, T: number, date: string): number {
  const n = table.signals.length
  const to = table.dates.indexOf(date)
  return eigenvalues(logReturns(table), n, to - T, to)[0]! / n
}

const allFinite = (values: Float64Array) => values.every(Number.isFinite)
const ascending = (dates: readonly string[]) => dates.every((date, i) => i === 0 || dates[i - 1]! < date)

testWithOpenData(
  'dj30',
  'dj30 is 30 stocks × 2,529 days, byte for byte what R itself writes',
  async (table) => {
    expect([table.signals.length, table.dates.length]).toEqual([30, 2529])
    expect([table.dates[0], table.dates.at(-1)]).toEqual(['1990-12-31', '2001-01-02'])
    expect(ascending(table.dates) && allFinite(table.values)).toBe(true)
    const text = await sourceText(table)
    expect(text.length).toBe(462_507)
    // Size and sha256 of R's write.csv of DowJones30: the project's table of check values.
    expect(sha256(text)).toMatch(/^5a001dad/)
  },
)

testWithOpenData('dj30', 'dj30 has the leading share that numpy gives on two known days', (table) => {
  // Check values: T = 100, recomputed with numpy.
  expect(shareOn(table, 100, '1997-12-30')).toBeCloseTo(0.5027, 4)
  expect(shareOn(table, 100, '2001-01-02')).toBeCloseTo(0.1927, 4)
})

testWithOpenData(
  'sp20',
  'sp20 is 20 stocks × 8,313 days with the sha256 of its publication',
  async (table) => {
    expect([table.signals.length, table.dates.length]).toEqual([20, 8313])
    expect([table.dates[0], table.dates.at(-1)]).toEqual(['1990-01-02', '2022-12-28'])
    expect(ascending(table.dates) && allFinite(table.values)).toBe(true)
    const text = await sourceText(table)
    expect(text.length).toBe(1_213_016)
    expect(sha256(text)).toMatch(/^5f769c6d/)
  },
)

testWithOpenData('sp20', 'sp20 has the leading share that numpy gives on its highest day', (table) => {
  expect(shareOn(table, 100, '2020-03-17')).toBeCloseTo(0.7419, 4)
})

testWithOpenData(
  'wind',
  'wind is 12 stations × 6,574 days with the eigenvalues that numpy gives',
  (table) => {
    expect([table.signals.length, table.dates.length]).toEqual([12, 6574])
    expect([table.dates[0], table.dates.at(-1)]).toEqual(['1961-01-01', '1978-12-31'])
    expect(ascending(table.dates) && allFinite(table.values)).toBe(true)
    // Check values: correlation of the raw columns, recomputed with numpy.
    const expected = [
      9.438266, 0.753552, 0.522126, 0.306582, 0.252297, 0.161885, 0.121898, 0.105204, 0.101084, 0.092105,
      0.08158, 0.06342,
    ]
    const found = eigenvalues(table.values, 12, 0, 6574)
    expected.forEach((value, i) => {
      expect(found[i]).toBeCloseTo(value, 6)
    })
  },
)

testWithOpenData('usemp', 'usemp is 22 series × 120 months, nearly singular', (table) => {
  expect([table.signals.length, table.dates.length]).toEqual([22, 120])
  expect([table.dates[0], table.dates.at(-1)]).toEqual(['2006-01-01', '2015-12-01'])
  expect(ascending(table.dates) && allFinite(table.values)).toBe(true)
  // Check values: T = 36 months, share 0.728 (2009-04) and 0.252 (2013-02).
  expect(shareOn(table, 36, '2009-04-01')).toBeCloseTo(0.728, 3)
  expect(shareOn(table, 36, '2013-02-01')).toBeCloseTo(0.252, 3)
})
