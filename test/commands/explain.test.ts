import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import type { Alert } from '../../src/alerts/alert.ts'
import { cautions, detailsOf, sentenceOf } from '../../src/alerts/wording.ts'
import { explain } from '../../src/commands/explain.ts'
import { type ReferenceRecord, readReference } from '../../src/regime/reference-record.ts'
import type { Shift } from '../../src/regime/regime.ts'
import { openStore } from '../../src/store/open-store.ts'
import { runLine } from './surroundings.ts'

let folder: string
let settings: string
const start = Date.UTC(2026, 10, 2, 10)

const shift = (number: number): Shift => ({
  number,
  kind: 'strength',
  start: start + number * 3_600_000,
  startFrom: start,
  startTo: start,
  confirmed: start,
  frame: 1500,
  carriers: [{ signal: 'QUAY', share: 0.06 }],
  remainder: 0.94,
  shareBefore: 0.21,
  shareAfter: 0.52,
  distance: { w2: 0.8, ceiling: 0.9, rotation: 0.21 },
  evidence: { statistic: 'leading-share', value: 0.52, limit: 0.3, ratio: 1.73 },
  certificate: 0.013,
  sight: 1.49,
  likeness: [],
  spectrumBefore: [10.2, 2.4, 1.9],
  spectrumAfter: [24.9, 1.4, 1.1],
  statistics: [{ statistic: 'leading-share', value: 0.52, limit: 0.3 }],
})

const alert = (number: number, ended: number | null): Alert => ({
  id: `desk/${number}/2026-11-02T1${number}:00:00Z`,
  version: 1,
  ensemble: 'desk',
  title: 'Northern desk',
  state: ended === null ? 'unacknowledged' : 'returned-to-normal',
  ended,
  trial: false,
  sentence: sentenceOf('Northern desk', shift(number), ended),
  details: detailsOf(shift(number)),
  cautions,
  runbook: null,
  page: null,
  shift: shift(number),
  raised: start + number,
})

beforeAll(() => {
  folder = mkdtempSync(join(tmpdir(), 'tautline-explain-'))
  settings = join(folder, 'desk.yaml')
  writeFileSync(
    settings,
    'ensembles: { desk: { signals: [A, B], clock: { step: 5s }, window: { frames: 20 } } }\nstore: { path: a.db }\n',
  )
  const store = openStore(join(folder, 'a.db'))
  for (const one of [alert(1, start), alert(2, null)]) store.saveAlert(one.id, one)
  const transition = {
    time: start,
    frame: 1500,
    from: 'straining',
    to: 'shifted',
    why: 'the evidence held',
    shift: 2,
  }
  store.journal([{ time: start, kind: 'transition', ensemble: 'desk', body: transition }])
  store.saveCheckpoint({
    version: 1,
    savedAt: start,
    positions: {},
    ensembles: { desk: 'full', plant: 'learning' },
  })
  store.quarantine([
    {
      feed: 'ticks',
      source: 'ticks/0',
      position: '41',
      reason: 'unreadable',
      detail: 'no JSON',
      start: '{"sy',
      at: start,
    },
  ])
  store.close()
})
afterAll(() => rmSync(folder, { recursive: true }))

const record: ReferenceRecord = {
  type: 'reference',
  names: ['A', 'B'],
  frames: 99,
  matrix: [
    [1, 0.5],
    [0.5, 1],
  ],
  means: [0, 0],
  scales: [1, 1],
  spread: 4,
  unevenness: 1.5,
}
const referenceOf = (snapshot: unknown) => (snapshot === 'full' ? record : null)

const run = (...args: string[]) =>
  runLine(['explain', ...args, '--settings', settings], {
    commands: { explain: (options) => explain(options, { referenceOf }) },
  })

describe('explain', () => {
  it('without a name lists what there is', async () => {
    const { status, stdout } = await run()
    expect(status).toBe(0)
    expect(stdout).toContain('desk/1/2026-11-02T11:00:00Z  returned to normal')
    expect(stdout).toContain('desk/2/2026-11-02T12:00:00Z  unacknowledged')
  })

  it.each(['desk', 'desk/2', 'desk/2/2026-11-02T12:00:00Z'])(
    '%s shows the shift in full',
    async (subject) => {
      const { status, stdout } = await run(subject)
      expect(status).toBe(0)
      for (const words of [
        'Alert desk/2/',
        'QUAY',
        'leading-share        0.52 over 0.3',
        'before  10.2  2.4  1.9',
        'after   24.9  1.4  1.1',
        'straining to shifted: the evidence held',
        'Truncation certificate: 0.013',
        'no investment advice',
      ])
        expect(stdout).toContain(words)
    },
  )

  it('with --json gives the same as one record', async () => {
    const { stdout } = await run('desk/1', '--json')
    expect(JSON.parse(stdout)).toMatchObject({
      type: 'explanation',
      alert: { id: 'desk/1/2026-11-02T11:00:00Z' },
      transitions: [],
    })
  })

  it('--quarantine shows the records that could not be read', async () => {
    expect((await run('--quarantine')).stdout).toContain('ticks/0 at 41  unreadable: no JSON')
    expect(JSON.parse((await run('--quarantine', '--json')).stdout)).toMatchObject({
      type: 'quarantined',
      at: '2026-11-02T10:00:00.000Z',
      position: '41',
    })
  })

  it('a name that the store does not hold is `nothing-to-explain`, status 1', async () => {
    const { status, stderr } = await run('desk/7')
    expect(status).toBe(1)
    expect(stderr).toContain('(nothing-to-explain)')
  })

  it('--reference writes the reference that the checkpoint holds, in the form that settings read', async () => {
    const path = join(folder, 'quiet.json')
    expect((await run('desk', '--reference', path)).status).toBe(0)
    expect(readReference(JSON.parse(readFileSync(path, 'utf8')))).toEqual({ ok: true, value: record })
    for (const name of ['plant', 'nobody']) {
      const ran = await run(name, '--reference', join(folder, 'none.json'))
      expect([ran.status, ran.stderr.includes('(nothing-to-explain)')]).toEqual([1, true])
    }
    expect((await run('desk/3', '--reference', path)).stderr).toContain('(usage)')
  })

  it('does not make a store where there is none', async () => {
    const path = join(folder, 'new.yaml')
    writeFileSync(
      path,
      'ensembles: { desk: { signals: [A, B], clock: { step: 5s }, window: { frames: 20 } } }\nstore: { path: none.db }\n',
    )
    const ran = await runLine(['explain', '--settings', path], {
      commands: { explain: (options) => explain(options, { referenceOf }) },
    })
    expect(ran.status).toBe(1)
    expect(ran.stderr).toContain('(store-missing)')
  })
})
