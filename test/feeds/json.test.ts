import fc from 'fast-check'
import { expect, test } from 'vitest'
import { eitherTime } from '../../src/feeds/json-reader.ts'
import { JsonScanner } from '../../src/feeds/json-scanner.ts'
import { NameTable } from '../../src/feeds/name-table.ts'
import type { FormatSettings } from '../../src/settings/schema.ts'
import { readBytes, readMessage } from './support/read.ts'

const t = 1_700_000_000_000
const pointers = (
  more: Partial<Extract<FormatSettings, { signal: string; time: string; unit: string }>> = {},
) => ({ signal: '/sym', time: '/ts', value: '/px', unit: 'ms', ...more }) as FormatSettings

test.for([
  ['plain', `{"signal":"A","time":${t},"value":1.5}`],
  [
    'another order, blanks and members besides',
    `{ "more": null, "value" : 1.5,\t"time":${t} ,"signal":"A", "x":"y" }  `,
  ],
  ['RFC 3339', '{"signal":"A","time":"2023-11-14T22:13:20Z","value":1.5}'],
  ['RFC 3339 with an offset', '{"signal":"A","time":"2023-11-14T23:13:20.000+01:00","value":1.5}'],
  ['escapes', `{"sign\\u0061l":"\\u0041","time":${t},"value":1.5}`],
  ['nested members besides', `{"x":{"signal":"B"},"signal":"A","time":${t},"value":1.5,"y":[1,[2]]}`],
  ['a member twice: the last one counts', `{"signal":"Z","signal":"A","time":${t},"value":2,"value":1.5}`],
  ['an exponent', `{"signal":"A","time":${t / 1e5}e5,"value":15e-1}`],
] as const)('NDJSON: %s', ([, line]) => {
  for (const fast of [true, false])
    expect(readBytes('ndjson', Buffer.from(`${line}\n${line}\r\n${line}`), { fast })).toMatchObject({
      readings: [
        ['A', t, 1.5],
        ['A', t, 1.5],
        ['A', t, 1.5],
      ],
      dropped: {},
    })
})

test.for([
  ['s', 1_700_000_000],
  ['s', '1700000000'],
  ['ms', t],
  ['ms', `${t}`],
  ['us', t * 1e3],
  ['ns', `${t}000000`],
  ['rfc3339', '2023-11-14T22:13:20Z'],
] as const)('a time in %s: %j', ([unit, ts]) => {
  const line = Buffer.from(`${JSON.stringify({ sym: 'A', ts, px: 2 })}\n`)
  for (const fast of [true, false])
    expect(readBytes(pointers({ unit }), line, { fast }).readings).toEqual([['A', t, 2]])
})

test.for([
  ['rfc3339', t],
  ['ms', '2023-11-14T22:13:20Z'],
  ['s', t],
  ['ms', null],
  ['ms', true],
  ['ms', [t]],
] as const)('no time in %s: %j', ([unit, ts]) => {
  const line = Buffer.from(`${JSON.stringify({ sym: 'A', ts, px: 2 })}\n`)
  for (const fast of [true, false])
    expect(readBytes(pointers({ unit }), line, { fast })).toMatchObject({
      readings: [],
      dropped: { 'bad-time': 1 },
    })
})

test('pointers lead anywhere, into arrays too', () => {
  const format = pointers({ signal: '/meta/a~1b/0', time: '/when/~0', value: '/v/1/x' })
  const record = { meta: { 'a/b': ['A'] }, when: { '~': t }, v: [0, { x: 7 }] }
  expect(readBytes(format, Buffer.from(JSON.stringify(record))).readings).toEqual([['A', t, 7]])
})

test('an array of readings is read element by element; a bad one does not spoil the others', () => {
  const all = [
    { sym: 'A', ts: t, px: 1 },
    { sym: 'B', ts: t },
    5,
    null,
    { sym: 'C', ts: t, px: 'x' },
    { sym: 'D', ts: t, px: 4 },
  ]
  const expected = {
    readings: [
      ['A', t, 1],
      ['D', t, 4],
    ],
    dropped: { unreadable: 3, 'bad-value': 1 },
  }
  expect(readBytes(pointers({ readings: '/all' }), Buffer.from(JSON.stringify({ all })))).toMatchObject(
    expected,
  )
  const whole = readMessage(pointers({ readings: '' }), Buffer.from(JSON.stringify(all, null, 2)))
  expect(whole).toMatchObject(expected)
  expect(whole.quarantined).toHaveLength(1)
})

test('one reading a message may be written over several lines', () => {
  const message = Buffer.from(JSON.stringify({ sym: 'A', ts: t, px: 1 }, null, 2))
  expect(readMessage(pointers(), message).readings).toEqual([['A', t, 1]])
  expect(readMessage(pointers(), Buffer.from(`\ufeff{"sym":"A","ts":${t},"px":1}`)).readings).toEqual([
    ['A', t, 1],
  ])
})

test('nesting is allowed to 64 levels', () => {
  const nested = (depth: number) =>
    `{"sym":"A","ts":${t},"px":1,"x":${'['.repeat(depth)}${']'.repeat(depth)}}`
  expect(readBytes(pointers(), Buffer.from(nested(63))).readings).toHaveLength(1)
  expect(readBytes(pointers(), Buffer.from(nested(64)))).toMatchObject({
    readings: [],
    dropped: { unreadable: 1 },
  })
  const inText = `{"sym":"A","ts":${t},"px":1,"x":"${'['.repeat(200)}\\"["}`
  expect(readBytes(pointers(), Buffer.from(inText)).readings).toHaveLength(1)
})

test('nothing in a record reaches the prototypes', () => {
  const lines = [
    `{"__proto__":{"polluted":1},"signal":"A","time":${t},"value":1}`,
    `{"constructor":{"prototype":{"polluted":1}},"signal":"__proto__","time":${t},"value":1}`,
  ].join('\n')
  expect(readBytes('ndjson', Buffer.from(lines)).readings.map(([name]) => name)).toEqual(['A', '__proto__'])
  expect(({} as { polluted?: number }).polluted).toBeUndefined()
  const inherited = '{"__proto__":{"signal":"A","time":1700000000000,"value":1}}'
  expect(readBytes('ndjson', Buffer.from(inherited)).dropped).toEqual({ unreadable: 1 })
})

test('records of known signals take the fast way', () => {
  const names = new NameTable()
  names.internText('A')
  const scanner = JsonScanner.for('signal', 'time', 'value', eitherTime, names)!
  for (const record of [
    `{"signal":"A","time":${t},"value":1.5}`,
    `{"value":-1.5e3, "time": "2023-11-14T22:13:20Z", "signal":"A" }`,
    `{"seq":17,"ok":true,"signal":"A","note":"x","time":${t},"value":1.5,"z":null}`,
  ])
    expect(scanner.scan(Buffer.from(`${record}\n`), 0)).toBe(record.length + 1)
  for (const record of [`{"signal":"B","time":${t},"value":1.5}`, '{"signal":"A"}', '{}', '[]', ''])
    expect(scanner.scan(Buffer.from(`${record}\n`), 0)).toBe(-1)
})

/** Lines near to what is read fast: members of all kinds in any order, blanks, faults of one byte. */
const scalar = fc.oneof(
  fc.double().map((x) => JSON.stringify(x)),
  fc.constantFrom(
    'true',
    'false',
    'null',
    '-',
    '01',
    '1.',
    '.5',
    '1e5',
    '1E+2',
    '1e400',
    '-0',
    '9007199254740993',
  ),
  fc.string({ unit: 'binary', maxLength: 6 }).map((x) => JSON.stringify(x)),
  fc.constantFrom('"a\tb"', '"\\u0041"', '"\\x"', '"', '{}', '[1]', '{"signal":"B"}'),
)
const time = fc.oneof(
  fc.integer({ min: 1_600_000_000, max: 1_800_000_000 }).map(String),
  fc.integer({ min: t, max: t + 1e9 }).map(String),
  fc.constantFrom(
    `"2023-11-14T22:13:20Z"`,
    '"2023-11-14"',
    `"${t}"`,
    `${t}.5`,
    '1.7e12',
    '-1',
    '1e15',
    `"2023-11-14T22:13:20.${'5'.repeat(80)}Z"`,
  ),
)
const name = fc.constantFrom('"A"', '"B"', '"QUAY"', '"é"', '"漢"', '""', '"a\\n"', '"\ud800"', '17')
const member = fc.oneof(
  { weight: 5, arbitrary: name.map((v) => ['"signal"', v] as const) },
  { weight: 5, arbitrary: time.map((v) => ['"time"', v] as const) },
  { weight: 5, arbitrary: scalar.map((v) => ['"value"', v] as const) },
  {
    weight: 2,
    arbitrary: fc.tuple(fc.constantFrom('"x"', '"sig"', '"signal "', '"\\u0074ime"', '""', 'x'), scalar),
  },
)
const blank = fc.constantFrom('', '', '', ' ', '\t', '  ', '\r')
const looseLine = fc
  .tuple(fc.array(fc.tuple(member, blank, blank, blank), { maxLength: 6 }), blank, blank)
  .map(([members, open, close]) => {
    const inside = members.map(([[key, value], a, b, c]) => `${a}${key}${b}:${c}${value}`).join(',')
    return `{${open}${inside}}${close}`
  })
const likelyLine = fc
  .tuple(name, time, fc.double({ noNaN: true, noDefaultInfinity: true }), fc.constantFrom('', ' '))
  .map(([s, at, v, gap]) => `{"signal":${s},${gap}"time":${at},"value":${JSON.stringify(v)}}`)
const line = fc.oneof(looseLine, likelyLine)

test('the fast way reads exactly what JSON.parse reads, whatever comes', () => {
  const document = fc.tuple(fc.array(line, { maxLength: 12 }), fc.constantFrom('\n', '\r\n'))
  const units = fc.constantFrom<FormatSettings>(
    'ndjson',
    ...(['rfc3339', 's', 'ms', 'us', 'ns'] as const).map((unit) =>
      pointers({ signal: '/signal', time: '/time', value: '/value', unit }),
    ),
  )
  let fastReadings = 0
  fc.assert(
    fc.property(document, units, fc.integer({ min: 30, max: 200 }), ([lines, end], format, limit) => {
      // Twice: at the second time the names are known, and the fast way is open to them.
      const bytes = Buffer.from([...lines, ...lines].join(end))
      const fast = readBytes(format, bytes, { fast: true, limit })
      expect(fast).toEqual(readBytes(format, bytes, { fast: false, limit }))
      fastReadings += fast.readings.length
    }),
    { seed: 1, numRuns: 3000 },
  )
  expect(fastReadings).toBeGreaterThan(3000)
})

test('the fast way reads exactly what JSON.parse reads when bytes are hit at random', () => {
  const hit = fc.tuple(fc.nat(), fc.integer({ min: 0, max: 255 }))
  fc.assert(
    fc.property(
      fc.array(likelyLine, { minLength: 1, maxLength: 5 }),
      fc.array(hit, { maxLength: 4 }),
      (lines, hits) => {
        const bytes = Buffer.from(`${[...lines, ...lines].join('\n')}\n`)
        for (const [at, byte] of hits) bytes[at % bytes.length] = byte
        expect(readBytes('ndjson', bytes, { fast: true })).toEqual(
          readBytes('ndjson', bytes, { fast: false }),
        )
      },
    ),
    { seed: 2, numRuns: 3000 },
  )
})
