import { expect } from 'vitest'
import { testWithOpenData } from '../support/open-data.ts'
import { replayTable } from './support/replay-table.ts'

testWithOpenData(
  'usemp',
  'aggregates that make the matrix singular give finite figures, no eigenvalue below rounding, and the known shares',
  async (table) => {
    const records = (await replayTable(table, 36)).filter(({ share }) => share !== null)
    const shareOf = (month: string) => records.find(({ time }) => time.startsWith(month))!.share!
    // Check values: T = 36 months, 22 series of US employment of which some are sums of others.
    expect(shareOf('2009-04')).toBeCloseTo(0.728, 3)
    expect(shareOf('2013-02')).toBeCloseTo(0.252, 3)
    for (const record of records) {
      expect(Math.min(...record.leading)).toBeGreaterThan(-1e-12 * record.leading[0]!)
      expect(record.edge).not.toBeNull()
      expect(JSON.stringify(record)).not.toMatch(/NaN|Infinity/)
    }
    expect(records.length).toBe(120 - 36)
  },
)
