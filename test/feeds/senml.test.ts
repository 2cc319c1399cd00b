import { expect, test } from 'vitest'
import { now, readBytes } from './support/read.ts'

const read = (pack: unknown) => readBytes('senml', Buffer.from(JSON.stringify(pack)))

// The examples of RFC 8428, section 5.1 (from memory; times as there).
test('a single datapoint without a time was measured now', () => {
  expect(read([{ n: 'urn:dev:ow:10e2073a01080063', u: 'Cel', v: 23.1 }]).readings).toEqual([
    ['urn:dev:ow:10e2073a01080063', now, 23.1],
  ])
})

test('base name, time and unit hold for the records that follow; times below 2^28 s are relative', () => {
  const pack = [
    {
      bn: 'urn:dev:ow:10e2073a0108006:',
      bt: 1.276020076001e9,
      bu: 'A',
      bver: 5,
      n: 'voltage',
      u: 'V',
      v: 120.1,
    },
    { n: 'current', t: -5, v: 1.2 },
    { n: 'current', t: -4, v: 1.3 },
    { n: 'current', v: 1.7 },
  ]
  const at = 1_276_020_076_001
  expect(read(pack).readings).toEqual([
    ['urn:dev:ow:10e2073a0108006:voltage', at, 120.1],
    ['urn:dev:ow:10e2073a0108006:current', at - 5000, 1.2],
    ['urn:dev:ow:10e2073a0108006:current', at - 4000, 1.3],
    ['urn:dev:ow:10e2073a0108006:current', at, 1.7],
  ])
})

test('seconds before now and after it', () => {
  const pack = [
    { n: 'a', t: -60, v: 1 },
    { n: 'a', t: 0, v: 2 },
    { n: 'a', t: 2.5, v: 3 },
    { n: 'a', t: 268435455, v: 4 },
  ]
  expect(read(pack).readings.map(([, time]) => time - now)).toEqual([-60_000, 0, 2500, 268_435_455_000])
  expect(read([{ n: 'a', t: 268435456, v: 4 }]).readings).toEqual([['a', 268_435_456_000, 4]])
})

test('a base value is added to the values, also to those that come later', () => {
  const pack = [
    { bn: 'a', bt: 1.7e9, bv: 100, v: 1 },
    { v: 2, t: 1 },
    { bv: -100, v: 3, t: 2 },
  ]
  expect(read(pack).readings).toEqual([
    ['a', 1.7e12, 101],
    ['a', 1.7e12 + 1000, 102],
    ['a', 1.7e12 + 2000, -97],
  ])
})

test('a base time alone moves the time; a record of base fields alone is no reading', () => {
  const pack = [{ bn: 'x/', bt: 1.7e9 }, { n: 'a', v: 1 }, { bt: 1.7e9 + 60 }, { n: 'a', v: 2 }]
  expect(read(pack)).toMatchObject({
    readings: [
      ['x/a', 1.7e12, 1],
      ['x/a', 1.7e12 + 60_000, 2],
    ],
    dropped: {},
  })
})

test('truth values are 0 and 1; texts, data and sums alone are counted', () => {
  const pack = [
    { bn: 'v', bt: 1.7e9, vb: true },
    { t: 1, vb: false },
    { t: 2, vs: 'open' },
    { t: 3, vd: 'aGk' },
    { t: 4, s: 12 },
    { t: 5, v: 7, s: 19 },
  ]
  expect(read(pack)).toMatchObject({
    readings: [
      ['v', 1.7e12, 1],
      ['v', 1.7e12 + 1000, 0],
      ['v', 1.7e12 + 5000, 7],
    ],
    dropped: { 'bad-value': 3 },
  })
})

test.for([
  ['no array', { n: 'a', v: 1 }, 'unreadable'],
  ['a record that is no object', [5], 'unreadable'],
  ['a later version', [{ bver: 11, n: 'a', v: 1 }], 'unreadable'],
  ['a version that is no number', [{ bver: '10', n: 'a', v: 1 }], 'unreadable'],
  [
    'a label that must be understood',
    [
      { n: 'a', v: 1 },
      { n: 'b', v: 1, mid_: 2 },
    ],
    'unreadable',
  ],
  ['a base name that is no text', [{ bn: 5, v: 1 }], 'unreadable'],
  ['a base time that is no number', [{ bt: '1.7e9', n: 'a', v: 1 }], 'unreadable'],
  ['a base value that is no number', [{ bv: '5', n: 'a', v: 1 }], 'unreadable'],
  ['two values', [{ n: 'a', v: 1, vb: true }], 'unreadable'],
  ['no value', [{ n: 'a', u: 'V' }], 'unreadable'],
  ['a value that is a text', [{ n: 'a', v: '1' }], 'bad-value'],
  ['a truth value that is a number', [{ n: 'a', vb: 1 }], 'bad-value'],
  ['a sum of base and value beyond all numbers', [{ n: 'a', bv: 1e308, v: 1e308 }], 'bad-value'],
  ['no name', [{ v: 1 }], 'bad-signal'],
  ['a name that is no text', [{ n: 7, v: 1 }], 'bad-signal'],
  ['a time that is no number', [{ n: 'a', t: 'now', v: 1 }], 'bad-time'],
  ['a time after the year 2200', [{ n: 'a', t: 8e9, v: 1 }], 'bad-time'],
] as const)('refused: %s', ([, pack, reason]) => {
  expect(read(pack)).toMatchObject({ readings: [], dropped: { [reason]: 1 } })
})

test('an empty pack is nothing', () => {
  expect(read([])).toMatchObject({ readings: [], dropped: {} })
})
