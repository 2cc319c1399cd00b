import fc from 'fast-check'
import { expect, test } from 'vitest'
import type { FormatSettings } from '../../src/settings/schema.ts'
import { readBytes, readMessage } from './support/read.ts'

const wide: FormatSettings = { csv: 'wide', time: 'date', unit: 'rfc3339' }
const long: FormatSettings = { csv: 'long', time: 'time', signal: 'signal', value: 'value', unit: 'ms' }
const day = Date.UTC(2026, 0, 2)
const t = 1_700_000_000_000

const read = (format: FormatSettings, text: string, how = {}) => readBytes(format, Buffer.from(text), how)

test('wide: every other column is a signal; an empty cell and NA are no reading', () => {
  const text = 'date,A,B,C\n2026-01-02,1.5,,NA\n2026-01-02,"2.5", 3 ,-4e1\r\n'
  expect(read(wide, text)).toMatchObject({
    readings: [
      ['A', day, 1.5],
      ['A', day, 2.5],
      ['B', day, 3],
      ['C', day, -40],
    ],
    dropped: {},
  })
})

test('wide: the time column may stand anywhere', () => {
  expect(read(wide, 'A,date,B\n1,2026-01-02,2').readings).toEqual([
    ['A', day, 1],
    ['B', day, 2],
  ])
})

test('wide: a cell that is no number is counted, the others of its row are read', () => {
  const outcome = read(wide, 'date,A,B,C,D,E\n2026-01-02,NaN,Inf,1e400,x,7')
  expect(outcome).toMatchObject({ readings: [['E', day, 7]], dropped: { 'bad-value': 4 } })
  expect(outcome.quarantined).toHaveLength(1)
  expect(outcome.quarantined[0]).toMatchObject({
    position: '2',
    reason: 'bad-value',
    start: '2026-01-02,NaN,Inf,1e400,x,7',
  })
})

test('wide: a column without a usable name is left out and counted once', () => {
  expect(read(wide, ',date,A\n1,2026-01-02,5\n2,2026-01-02,6')).toMatchObject({
    readings: [
      ['A', day, 5],
      ['A', day, 6],
    ],
    dropped: { 'bad-signal': 1 },
  })
})

test('wide: 500 columns', () => {
  const names = Array.from({ length: 500 }, (_, i) => `S${i}`)
  const text = `date,${names}\n2026-01-02,${names.map((_, i) => i / 4)}\n`
  expect(read(wide, text).readings).toEqual(names.map((name, i) => [name, day, i / 4]))
})

test('long: three columns by name among others', () => {
  const text = `note,value,signal,time\n"a, ""b""",1.25,QUAY,${t}\nx,-3,"PIER, NORTH",${t}.5\ny,2,"say ""hi""",${t}`
  expect(read(long, text)).toMatchObject({
    readings: [
      ['QUAY', t, 1.25],
      ['PIER, NORTH', t + 0.5, -3],
      ['say "hi"', t, 2],
    ],
    dropped: {},
  })
})

test('long: faults are counted, each with its reason', () => {
  const rows = [
    `${t},A`,
    `${t},A,1,2`,
    `yesterday,A,1`,
    `${t},A,`,
    `${t},A,NA`,
    `${t},,1`,
    `${t},A\tB,1`,
    `${t},"A"x,1`,
    `${t},A,"1`,
    `${t},A,2`,
  ]
  const outcome = read(long, `time,signal,value\n${rows.join('\n')}\n`)
  expect(outcome.readings).toEqual([['A', t, 2]])
  expect(outcome.dropped).toEqual({ unreadable: 4, 'bad-time': 1, 'bad-value': 2, 'bad-signal': 2 })
  expect(outcome.quarantined.map(({ position }) => position)).toEqual([
    '2',
    '3',
    '4',
    '5',
    '6',
    '7',
    '8',
    '9',
    '10',
  ])
})

test('a cell may hold line ends; lines are counted on', () => {
  const text = `time,signal,value,note\n${t},A,1,"two\nlines"\n${t},A,x,\n`
  expect(read(long, text)).toMatchObject({
    readings: [['A', t, 1]],
    quarantined: [{ position: '4', reason: 'bad-value' }],
  })
})

test('a quotation mark that is never closed costs its own line only', () => {
  const rows = Array.from({ length: 100 }, (_, i) => `${t + i},A,${i}`)
  const text = `time,signal,value\n${t},"A,1\n${rows.join('\n')}\n`
  for (const limit of [300, 1 << 20]) {
    const outcome = read(long, text, { limit })
    expect(outcome.readings).toHaveLength(100)
    expect(outcome.dropped).toEqual({ unreadable: 1 })
  }
})

test.for([
  ['no time column', wide, 'day,A\n2026-01-02,1', 'There is no column "date"; the header has "day", "A".'],
  ['a semicolon for the comma', wide, 'date;A\n2026-01-02;1', 'the header has "date;A"'],
  ['a signal twice', wide, 'date,A,A\n', 'The column "A" stands more than once.'],
  ['the time twice', wide, 'date,A,date\n', 'The column "date" stands more than once.'],
  ['no value column', long, 'time,signal,price\n', 'There is no column "value"'],
  ['a broken quotation', wide, 'date,"A"B\n', 'Text follows a closing quotation mark.'],
] as const)('a header with %s is an error that the user can mend', ([, format, text, detail]) => {
  expect(read(format, text).error).toContain('feed-columns')
  expect(read(format, text).error).toContain(detail)
  expect(readMessage(format, Buffer.from(text))).toMatchObject({ readings: [], dropped: { unreadable: 1 } })
})

test('an empty text, blank lines and a lone header hold nothing', () => {
  for (const text of ['', '\n', '\r\n\n', 'date,A', 'date,A\n\n\r\n'])
    expect(read(wide, text)).toMatchObject({ readings: [], dropped: {}, error: null })
})

test('every message has its own header', () => {
  expect(readMessage(wide, Buffer.from('date,A\n2026-01-02,1\n2026-01-02,2\n')).readings).toHaveLength(2)
  expect(readMessage(wide, Buffer.from('')).readings).toHaveLength(0)
})

/** A cell as RFC 4180 writes it, with quotation marks where they are needed or wanted. */
const written = (cell: string, quote: boolean): string =>
  quote || /[",\r\n]|^\s|\s$/.test(cell) ? `"${cell.replaceAll('"', '""')}"` : cell

test('whatever names and values are written by RFC 4180 are read back', () => {
  const cell = fc.string({ unit: fc.constantFrom(...'ab",é 漢;\'|'), minLength: 1, maxLength: 8 })
  const row = fc.tuple(
    cell,
    fc.double({ noNaN: true, noDefaultInfinity: true }),
    fc.boolean(),
    fc.string({ maxLength: 5 }),
  )
  fc.assert(
    fc.property(fc.array(row, { maxLength: 20 }), fc.constantFrom('\n', '\r\n'), (rows, end) => {
      const lines = rows.map(([name, value, quote, note]) =>
        [
          written(note, quote),
          written(name, quote),
          written(Object.is(value, -0) ? '-0' : String(value), quote),
          String(t),
        ].join(','),
      )
      const outcome = read(long, ['note,signal,value,time', ...lines, ''].join(end))
      expect(outcome.readings).toEqual(rows.map(([name, value]) => [name, t, value]))
      expect(outcome.dropped).toEqual({})
    }),
    { seed: 1, numRuns: 500 },
  )
})
