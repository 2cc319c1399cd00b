import { Writable } from 'node:stream'
import { replay } from '../../../src/commands/replay.ts'
import type { FrameRecord, TautlineRecord } from '../../../src/observe/records.ts'
import { parseSettings } from '../../../src/settings/read-settings.ts'
import type { OpenTable } from '../../support/open-data.ts'

export type { FrameRecord }

/** Settings of a plain rolling correlation over a wide CSV file, held against the window T rows earlier. */
const plainSettings = (table: OpenTable, T: number): string => `
ensembles:
  closes:
    signals: { pattern: "*" }
    clock: { step: row }
    increment: log-return
    common-volatility: keep
    truncate: off
    window: { frames: ${T} }
    reference: { lagged: ${T} }
feeds:
  closes: { file: { path: ${JSON.stringify(table.csvPath)} }, format: { csv: wide, time: date } }
`

/** What `tautline replay --json` writes for these settings. */
export async function replayRecords(settings: string, path = 'settings.yaml'): Promise<TautlineRecord[]> {
  const read = parseSettings(path, settings, {})
  if (!read.ok) throw new Error(read.error.map((problem) => JSON.stringify(problem)).join('\n'))
  const stdout = new Gathered()
  const stderr = new Gathered()
  await replay({
    io: { stdout, stderr, env: {}, now: Date.now },
    json: true,
    logLevel: 'info',
    settingsPath: path,
    read: read.value,
    from: null,
    every: 1,
    expectSteady: false,
    report: null,
  })
  return stdout.text
    .trimEnd()
    .split('\n')
    .map((line) => JSON.parse(line) as TautlineRecord)
}

export async function replayTable(table: OpenTable, T: number): Promise<FrameRecord[]> {
  const records = await replayRecords(plainSettings(table, T))
  return records.filter((record) => record.type === 'frame')
}

/** A stream that keeps what is written to it. */
export class Gathered extends Writable {
  text = ''

  override _write(chunk: Buffer, _encoding: string, done: () => void): void {
    this.text += chunk.toString()
    done()
  }
}
