import { fileURLToPath } from 'node:url'
import { Ajv2020 } from 'ajv/dist/2020.js'
import formats from 'ajv-formats'
import { describe, expect, test } from 'vitest'
import { defaultClock } from '../../demo-feeds/demo-feed.ts'
import { deskEvents, deskReadings, deskSignals } from '../../demo-feeds/desk.ts'
import { composeEnsemble } from '../../src/compose.ts'
import type { Judged } from '../../src/ensemble.ts'
import { errorCatalogue } from '../../src/errors.ts'
import {
  findingRecord,
  frameRecord,
  recordSchema,
  recordsJsonSchema,
  shiftRecord,
  summaryRecord,
  type TautlineRecord,
  timestamp,
  transitionRecord,
} from '../../src/observe/records.ts'
import type { Shift } from '../../src/regime/regime.ts'
import { settingsSchema } from '../../src/settings/schema.ts'
import { judged, shiftAt } from '../page/support/invented.ts'

const published = fileURLToPath(new URL('../../schema/records.schema.json', import.meta.url))
const ajv = new Ajv2020({ allErrors: true, strict: true, strictTypes: false })
formats.default(ajv)
const validate = ajv.compile(recordsJsonSchema())

/** All records of the invented desk until its spike is called, and one reading dropped. */
function deskRecords(): TautlineRecord[] {
  const settings = settingsSchema.parse({
    ensembles: {
      desk: {
        signals: [...deskSignals],
        clock: { step: '5s', lateness: '2s' },
        window: { frames: 60 },
        reference: { frames: 120 },
      },
    },
  })
  const composed = composeEnsemble('desk', settings.ensembles.desk!)
  if (!composed.ok) throw composed.error
  const ensemble = composed.value
  const events = deskEvents().flatMap((event) =>
    event.what === 'market-mode-spike' ? [{ ...event, from: 260, to: null }] : [],
  )
  const records: TautlineRecord[] = []
  for (const chunk of deskReadings({ ...defaultClock, frames: 500 }, events)) {
    const batch = { ...chunk, dropped: {} }
    const made = ensemble.take(
      'ticks',
      { type: 'batch', source: 'x', batch, quarantined: [], position: {}, behind: null, done() {} },
      Date.UTC(2030, 0),
    )
    for (const finding of made.findings) records.push(findingRecord('desk', finding))
    for (const frame of made.frames) {
      const judged = ensemble.judge(frame, () => 0)
      records.push(frameRecord(judged))
      for (const transition of judged.verdict.transitions) records.push(transitionRecord('desk', transition))
      if (judged.verdict.shift !== null) records.push(shiftRecord('desk', judged.verdict.shift))
    }
  }
  records.push(findingRecord('desk', { signal: null, finding: 'gap', from: 1, to: 2.5, detail: 'silence' }))
  records.push(
    summaryRecord({ readings: 3, dropped: { late: 1 }, frames: 2, shifts: 1, findings: 1, seconds: 0.5 }),
  )
  return records
}

describe('records', () => {
  const records = deskRecords()

  test('schema/records.schema.json is what the source gives; `npm run schema` writes it anew', async () => {
    await expect(`${JSON.stringify(recordsJsonSchema(), null, 2)}\n`).toMatchFileSnapshot(published)
  })

  test('every record of a run is of the published schema, `type` first, without a value that JSON cannot hold', () => {
    expect(new Set(records.map(({ type }) => type))).toEqual(
      new Set(['frame', 'shift', 'transition', 'finding', 'summary']),
    )
    for (const record of records) {
      expect(Object.keys(record)[0]).toBe('type')
      const line = JSON.stringify(record)
      expect(JSON.parse(line)).toEqual(record)
      expect(validate(JSON.parse(line)), `${line}\n${JSON.stringify(validate.errors)}`).toBe(true)
    }
  })

  test('what is not yet known is null while learning, and known later', () => {
    const frames = records.filter((record) => record.type === 'frame')
    const [first, last] = [frames[0]!, frames.at(-1)!]
    expect(first).toMatchObject({
      frame: 0,
      state: 'learning',
      share: null,
      leading: [],
      edge: null,
      distance: null,
      evidence: null,
    })
    for (const key of [
      'share',
      'edge',
      'distance',
      'evidence',
      'certificate',
      'sight',
      'spectrum',
    ] as const) {
      expect(last[key]).not.toBeNull()
    }
  })

  test('no figure of a steady frame or of a shift is left out: all that the house gives is finite', () => {
    const spoken = records.filter(
      (record) => (record.type === 'frame' && record.state !== 'learning') || record.type === 'shift',
    )
    expect(spoken.length).toBeGreaterThan(100)
    const unknown = spoken.flatMap((record) => nulls(record, record.type))
    expect(new Set(unknown)).toEqual(new Set(['frame.evidence.since']))
    for (const record of spoken) if (record.type === 'frame') expect(record.leading.length).toBe(8)
    for (const record of spoken) {
      if (record.type === 'shift') expect(record.spectrum_after.length).toBe(deskSignals.length)
    }
  })

  test('a figure that is not finite, wherever it stands, makes a record of the schema with null or less in it', () => {
    const nan = (value: unknown): unknown =>
      typeof value === 'number'
        ? Number.NaN
        : Array.isArray(value)
          ? value.map(nan)
          : value !== null && typeof value === 'object'
            ? Object.fromEntries(Object.entries(value).map(([key, inner]) => [key, nan(inner)]))
            : value
    const counts = { frame: 7, time: 1000, signals: 48, missing: 1 }
    const sound = judged(7)
    const frame = frameRecord({
      ...(nan(sound) as Judged),
      ...counts,
      window: { frames: 3, effective: Number.POSITIVE_INFINITY },
      verdict: {
        ...(nan(sound.verdict) as Judged['verdict']),
        evidence: { ratio: Number.NaN, statistic: 'a', since: 5 },
      },
    })
    const shift = shiftAt(7)
    const { number, start, startFrom, startTo, confirmed } = shift
    const shifted = shiftRecord('desk', {
      ...(nan(shift) as Shift),
      ...{ number, start, startFrom, startTo, confirmed, frame: 7 },
    })
    for (const record of [frame, shifted]) {
      expect(recordSchema.safeParse(record).error).toBeUndefined()
      expect(JSON.parse(JSON.stringify(record))).toEqual(record)
    }
    expect(frame).toMatchObject({
      share: null,
      leading: [],
      edge: null,
      escapes: [],
      distance: null,
      evidence: null,
    })
    expect(shifted).toMatchObject({ carriers: [], share_after: null, distance: null, spectrum_before: [] })
  })

  test('what ends a run is a record of the schema too', () => {
    const { sentence, remedy } = errorCatalogue['settings-wrong']
    const problem = {
      code: 'settings-unknown-key',
      line: 3,
      column: 5,
      key: 'ensembles.desk.clok',
      nearest: 'clock',
    }
    expect(
      validate({ type: 'error', code: 'settings-wrong', sentence, detail: '', remedy, problems: [problem] }),
    ).toBe(true)
  })

  test('the schema refuses a record with a key more, a key less or a wrong type', () => {
    const frame = records.find((record) => record.type === 'frame')!
    const { state: _state, ...less } = frame
    for (const wrong of [
      { ...frame, more: 1 },
      less,
      { ...frame, time: 'yesterday' },
      { ...frame, signals: -1 },
      { type: 'other' },
    ]) {
      expect(validate(wrong)).toBe(false)
    }
  })

  test('times are RFC 3339 in UTC, with milliseconds only where there are any', () => {
    expect(timestamp(Date.UTC(2026, 10, 2, 10, 42, 5))).toBe('2026-11-02T10:42:05Z')
    expect(timestamp(Date.UTC(2026, 10, 2, 10, 42, 5, 250))).toBe('2026-11-02T10:42:05.250Z')
  })
})

/** Where a record holds null, as a path of keys. */
function nulls(value: unknown, path: string): string[] {
  if (value === null) return [path]
  if (typeof value !== 'object') return []
  const inside = Array.isArray(value)
    ? value.map((inner) => [path, inner] as const)
    : Object.entries(value).map(([key, inner]) => [`${path}.${key}`, inner] as const)
  return inside.flatMap(([at, inner]) => nulls(inner, at))
}
