import fc from 'fast-check'
import { expect, test } from 'vitest'
import type { FormatSettings } from '../../src/settings/schema.ts'
import { readBytes } from './support/read.ts'

const t = 1_700_000_000_000
const line = (i: number) => `{"signal":"S${i}","time":${t + i},"value":${i}}`

test('a byte order mark, CRLF, blank lines and a missing line end at the end do no harm', () => {
  const bytes = Buffer.from(`\ufeff${line(1)}\r\n\r\n  \n${line(2)}`)
  expect(readBytes('ndjson', bytes)).toMatchObject({
    readings: [
      ['S1', t + 1, 1],
      ['S2', t + 2, 2],
    ],
    dropped: {},
    offset: bytes.length,
    line: 5,
  })
  const wide: FormatSettings = { csv: 'wide', time: 'date', unit: 'rfc3339' }
  expect(readBytes(wide, Buffer.from('\ufeffdate,A\n2026-01-02,1')).readings).toHaveLength(1)
})

test.for([
  ['UTF-16 little-endian', Buffer.from(`\ufeff${line(1)}\n`, 'utf16le')],
  ['UTF-16 big-endian', Buffer.from(`\ufeff${line(1)}\n`, 'utf16le').swap16()],
] as const)('%s is an error that the user can mend', ([, bytes]) => {
  expect(readBytes('ndjson', bytes)).toMatchObject({
    readings: [],
    error: expect.stringContaining('feed-encoding'),
  })
})

test('a line longer than the limit is counted once and skipped, whatever its length', () => {
  for (const length of [1001, 5000, 3_000_000]) {
    const bytes = Buffer.from(`${line(1)}\n${'x'.repeat(length)}\n${line(2)}\n${'y'.repeat(length)}`)
    const outcome = readBytes('ndjson', bytes, { limit: 1000, pieces: [7000] })
    expect(outcome).toMatchObject({
      readings: [
        ['S1', t + 1, 1],
        ['S2', t + 2, 2],
      ],
      dropped: { 'too-long': 2 },
      offset: bytes.length,
    })
    expect(outcome.quarantined.map(({ position, start }) => [position, start])).toEqual([
      ['2', 'x'.repeat(200)],
      ['4', 'y'.repeat(200)],
    ])
  }
})

test('a line as long as the limit is read, one byte more is too long', () => {
  const padded = (length: number) => {
    const start = `{"signal":"A","time":${t},"value":1`
    return `${start}${' '.repeat(length - start.length - 1)}}`
  }
  for (const fast of [true, false])
    for (const pieces of [[1], [1 << 18]]) {
      const bytes = Buffer.from(`${padded(60)}\n${padded(300)}\n${padded(301)}\n`)
      expect(readBytes('ndjson', bytes, { limit: 300, fast, pieces })).toMatchObject({
        readings: [
          ['A', t, 1],
          ['A', t, 1],
        ],
        dropped: { 'too-long': 1 },
      })
    }
})

const formats: readonly FormatSettings[] = [
  'ndjson',
  'senml',
  { csv: 'wide', time: 't', unit: 'ms' },
  { csv: 'long', time: 't', signal: 's', value: 'v', unit: 'ms' },
  { signal: '/s', time: '/t', value: '/v', unit: 'ms', readings: '/r' },
]
const pieceOfText = fc.oneof(
  fc.constantFrom(
    't,s,v',
    't,A,B',
    `${t},A,1.5`,
    `${t},1,2`,
    ',',
    '"',
    '""',
    '\n',
    '\r\n',
    '\n',
    line(1),
    line(2),
    `[{"n":"a","v":1}]`,
    `{"r":[{"s":"A","t":${t},"v":1}]}`,
    '{',
    '}',
    '\ufeff',
    'NA',
    '\0',
    ' ',
    'x'.repeat(50),
    `${t},"A\nB",3`,
  ),
  fc.string({ unit: 'binary', maxLength: 10 }),
)
const text = fc
  .array(fc.tuple(pieceOfText, fc.constantFrom('\n', '\n', '\n', '\r\n', '')), { maxLength: 40 })
  .map((pieces) => Buffer.from(pieces.flat().join('')))
const anyBytes = fc.uint8Array({ maxLength: 400 }).map((bytes) => Buffer.from(bytes))
const begun = fc.tuple(fc.constantFrom('t,s,v\n', 't,A,B\n', ''), fc.oneof(text, anyBytes))
const pieces = fc.array(fc.integer({ min: 1, max: 90 }), { minLength: 1, maxLength: 6 })

test('whatever the bytes, what is found does not depend on how they are cut, and nothing is thrown', () => {
  let readings = 0
  fc.assert(
    fc.property(
      begun,
      pieces,
      fc.integer({ min: 1, max: 50 }),
      fc.integer({ min: 20, max: 300 }),
      ([head, body], cut, size, limit) => {
        const bytes = Buffer.concat([Buffer.from(head), body])
        for (const format of formats) {
          const { quarantined, ...whole } = readBytes(format, bytes, { limit })
          const { quarantined: ofPieces, ...inPieces } = readBytes(format, bytes, {
            limit,
            pieces: cut,
            size,
          })
          expect(inPieces).toEqual(whole)
          // What is shown of a record that is too long may be cut with it.
          const places = (list: typeof quarantined) =>
            list.map(({ position, reason, detail }) => [position, reason, detail])
          expect(places(ofPieces)).toEqual(places(quarantined))
          readings += whole.readings.length
          expect(
            whole.readings.every(([, time, value]) => Number.isFinite(time) && Number.isFinite(value)),
          ).toBe(true)
        }
      },
    ),
    { seed: 1, numRuns: 1500 },
  )
  expect(readings).toBeGreaterThan(300)
})
