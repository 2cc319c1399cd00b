import { describe, expect, test } from 'vitest'
import { composeEnsemble } from '../../src/compose.ts'
import type { Judged } from '../../src/ensemble.ts'
import { settingsSchema } from '../../src/settings/schema.ts'
import { Random } from '../support/random.ts'

const start = Date.UTC(2026, 0, 5)

/** Judges 900 steps of a pattern ensemble; `here` says which signals have a reading in a step. */
function judge(here: (step: number) => readonly string[]): Judged[] {
  const settings = settingsSchema.parse({
    ensembles: {
      plant: {
        signals: { pattern: 'S*' },
        clock: { step: '1s', 'stale-after': '3s' },
        increment: 'difference',
        window: { frames: 60 },
        reference: { frames: 120 },
      },
    },
  })
  const composed = composeEnsemble('plant', settings.ensembles.plant!)
  if (!composed.ok) throw composed.error
  const random = new Random(5)
  const names: string[] = []
  const level = new Map<string, number>()
  const judged: Judged[] = []
  for (let step = 0; step < 900; step++) {
    const common = random.normal()
    const signals = here(step)
    for (const name of signals) {
      if (!names.includes(name)) names.push(name)
      level.set(name, (level.get(name) ?? 0) + common + random.normal())
    }
    const batch = {
      count: signals.length,
      names,
      signal: Int32Array.from(signals, (name) => names.indexOf(name)),
      time: new Float64Array(signals.length).fill(start + step * 1000),
      value: Float64Array.from(signals, (name) => level.get(name)!),
      dropped: {},
    }
    const made = composed.value.take(
      'feed',
      { type: 'batch', source: 'one', batch, quarantined: [], position: {}, behind: null, done() {} },
      start + 1e7,
    )
    for (const frame of made.frames) judged.push(composed.value.judge(frame, () => 0))
  }
  return judged
}

const ten = Array.from({ length: 10 }, (_, i) => `S${i}`)

describe('an ensemble whose signals change', () => {
  test('a dead transmitter leaves the matrix, is named, and is no shift', () => {
    const judged = judge((step) => (step < 400 ? ten : ten.slice(1)))
    const before = judged.find(({ time }) => time === start + 395_000)!
    const after = judged.at(-1)!
    expect([before.signals, before.absent]).toEqual([10, []])
    expect([after.signals, after.absent]).toEqual([9, [{ signal: 'S0', why: 'missing' }]])
    expect(judged.flatMap(({ verdict }) => verdict.shift ?? [])).toEqual([])
    expect(after.verdict.state).toBe('steady')
    expect(after.share).not.toBeNull()
  })

  test('a new listing joins the matrix once it fills the window, without restart and without a shift', () => {
    const judged = judge((step) => (step < 400 ? ten : [...ten, 'S-new']))
    const joined = judged.find(({ signals }) => signals === 11)!
    expect(judged[300]!.signals).toBe(10)
    expect((joined.time - start) / 1000 - 400).toBeGreaterThanOrEqual(0.8 * 60)
    expect(judged.at(-1)!.signals).toBe(11)
    expect(judged.flatMap(({ verdict }) => verdict.shift ?? [])).toEqual([])
  })
})
