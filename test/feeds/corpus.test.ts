import { describe, expect, test } from 'vitest'
import type { DropCounts } from '../../src/reasons.ts'
import type { Collected } from './support/collected.ts'
import { readMessage } from './support/read.ts'
import { type Case, cases, cut, formats, inputOf, play } from './support/rubbish-corpus.ts'

const total = (dropped: DropCounts): number => Object.values(dropped).reduce((sum, count) => sum + count, 0)

function expectOutcome(heard: Collected, wanted: Case): void {
  const { readings } = wanted
  if (typeof readings === 'number') expect(heard.readings).toHaveLength(readings)
  else expect(heard.readings.map(({ signal, time, value }) => [signal, time, value])).toEqual(readings)
  expect(heard.dropped).toEqual(wanted.dropped)
  expect((heard.error as { code?: string } | null)?.code ?? null).toBe(wanted.error ?? null)
  expect(heard.completed).toBe(wanted.error === undefined)
  for (const { signal, time, value } of heard.readings) {
    expect(signal).not.toMatch(/^$|\p{Cc}/u)
    expect(Number.isFinite(time) && Number.isFinite(value)).toBe(true)
  }
  expect(heard.quarantined.length > 0).toBe(total(wanted.dropped) > 0)
  for (const { reason } of heard.quarantined) expect(wanted.dropped[reason]).toBeGreaterThan(0)
  for (const { start, detail } of heard.quarantined) expect(start + detail).not.toMatch(/\p{Cc}/u)
}

test('the corpus holds at least 200 inputs, each with its own title', () => {
  expect(cases.length).toBeGreaterThanOrEqual(200)
  expect(new Set(cases.map(({ format, title }) => `${format}: ${title}`)).size).toBe(cases.length)
})

describe('each input ends in readings, counted reasons or a coded error, whole or byte by byte', () => {
  for (const each of cases)
    test(`${each.format}: ${each.title}`, async () => {
      const bytes = inputOf(each)
      expectOutcome(await play(formats[each.format], [bytes], each.limit), each)
      expectOutcome(await play(formats[each.format], cut(bytes, 1), each.limit), each)
    })
})

test('as a message, an input drops records only, and never throws', () => {
  for (const each of cases) {
    const { readings, dropped, error } = readMessage(formats[each.format], inputOf(each), {
      limit: each.limit ?? 1 << 20,
    })
    expect(error).toBeNull()
    expect(readings.every(([, time, value]) => Number.isFinite(time) && Number.isFinite(value))).toBe(true)
    if (total(each.dropped) > 0 && each.base64 === undefined)
      expect(total(dropped), each.title).toBeGreaterThan(0)
    if (each.error !== undefined) expect(total(dropped)).toBeGreaterThan(0)
  }
})
