import { createHash } from 'node:crypto'
import { mkdtemp, readFile, rm } from 'node:fs/promises'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { gunzipSync } from 'node:zlib'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { defaultClock } from '../../demo-feeds/demo-feed.ts'
import { deskEvents, deskReadings, deskSignals } from '../../demo-feeds/desk.ts'
import { recorded } from '../../demo-feeds/recorded.ts'
import { demoSettings } from '../../demo-feeds/settings.ts'
import { stationEvents, stationReadings } from '../../demo-feeds/station.ts'
import { write } from '../../demo-feeds/write.ts'
import { settingsSchema } from '../../src/settings/schema.ts'
import { sampled } from './sampled.ts'

const { start, stepMs } = defaultClock
const frames = 60
const digest = (pieces: Iterable<string>) => {
  const hash = createHash('sha256')
  for (const piece of pieces) hash.update(piece)
  return hash.digest('hex')
}

let folder = ''
beforeAll(async () => {
  folder = await mkdtemp(join(tmpdir(), 'tautline-recorded-'))
})
afterAll(() => rm(folder, { recursive: true }))

describe('recorded demo feeds', () => {
  for (const [name, readings] of [
    ['desk', deskReadings],
    ['station', stationReadings],
  ] as const)
    test(`the ${name} gives the same bytes for the same seed and others for another`, () => {
      const bytes = (seed: number) => digest(recorded(readings({ seed, frames }), 'ndjson'))
      expect(bytes(7)).toBe(bytes(7))
      expect(bytes(8)).not.toBe(bytes(7))
    })

  test('a feed cut short begins as the long one does', () => {
    const text = (count: number) => [...recorded(deskReadings({ frames: count }), 'csv-long')].join('')
    expect(text(frames).startsWith(text(20))).toBe(true)
  })

  test('NDJSON and long CSV hold every reading in order of arrival', () => {
    const [chunk] = [...deskReadings({ frames: 1 })]
    const lines = [...recorded([chunk!], 'ndjson')].join('').trimEnd().split('\n')
    expect(lines.length).toBe(chunk!.count)
    expect(lines.map((line) => JSON.parse(line))).toEqual(
      lines.map((_, i) => ({
        signal: deskSignals[chunk!.signal[i]!],
        time: chunk!.time[i],
        value: chunk!.value[i],
      })),
    )
    const [head, ...long] = [...recorded([chunk!], 'csv-long')].join('').trimEnd().split('\n')
    expect(head).toBe('time,signal,value')
    expect(long[3]).toBe(`${chunk!.time[3]},${deskSignals[chunk!.signal[3]!]},${chunk!.value[3]}`)
  })

  test('wide CSV holds what has arrived by the end of each frame', () => {
    const lines = [...recorded(stationReadings({ frames, latenessMs: 0 }), 'csv-wide')]
      .join('')
      .trimEnd()
      .split('\n')
    expect(lines.length).toBe(frames + 1)
    const expected = sampled(stationReadings({ frames, latenessMs: 0 }), start, stepMs)
    lines.slice(1).forEach((line, k) => {
      const [time, ...values] = line.split(',')
      expect(Date.parse(time!)).toBe(start + (k + 1) * stepMs)
      expect(values.map((value) => (value === '' ? Number.NaN : Number(value)))).toEqual([...expected[k]!])
    })
  })

  test('the script writes plain and compressed files that hold the same', async () => {
    const args = ['--feed', 'station', '--frames', '10', '--format', 'csv-long', '--out']
    await write([...args, join(folder, 'plain.csv')])
    await write([...args, join(folder, 'packed.csv.gz')])
    const plain = await readFile(join(folder, 'plain.csv'), 'utf8')
    expect(gunzipSync(await readFile(join(folder, 'packed.csv.gz'))).toString()).toBe(plain)
    expect(plain.split('\n').length).toBeGreaterThan(10 * 40)
  })

  test('the script says what is wrong with its options', async () => {
    const out = ['--out', join(folder, 'never')]
    await expect(write([])).rejects.toThrow('--out FILE is missing')
    await expect(write([...out, '--format', 'xml'])).rejects.toThrow(
      '--format takes ndjson, csv-long, csv-wide',
    )
    await expect(write([...out, '--feed', 'bank'])).rejects.toThrow('--feed takes desk or station')
    await expect(write([...out, '--frames', '1.5'])).rejects.toThrow('--frames takes a whole number')
    await expect(write([...out, '--start', 'soon'])).rejects.toThrow('--start takes a time')
  })
})

describe('the settings of the demo', () => {
  test('are settings, and announce the change-over', () => {
    const settings = settingsSchema.parse(demoSettings())
    expect(Object.keys(settings.ensembles)).toEqual(['desk', 'station'])
    expect(settings.ensembles.desk!.clock).toMatchObject({
      step: 5000,
      lateness: 2000,
      'stale-after': 60_000,
    })
    const planned = settings.ensembles.station!.planned
    expect(planned.length).toBe(1)
    const changeOver = stationEvents().find(({ what }) => what === 'change-over')!
    const time = start + changeOver.from * stepMs
    expect(Date.parse(planned[0]!.from)).toBeLessThan(time)
    expect(Date.parse(planned[0]!.to)).toBeGreaterThan(time)
  })

  test('leave time for a new reference and a window between one change and the next', () => {
    for (const events of [deskEvents(2), stationEvents(2)]) {
      const changes = events
        .filter(({ expected }) => expected === 'shift' || expected === 'planned')
        .flatMap(({ from, to }) => (to === null ? [from] : [from, to]))
      const moments = [...new Set(changes)].sort((a, b) => a - b)
      expect(moments[0]).toBeGreaterThan(240 + 120)
      moments.slice(1).forEach((moment, k) => {
        expect(moment - moments[k]!).toBeGreaterThan(240 + 120)
      })
    }
  })
})
