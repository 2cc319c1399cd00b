import fc from 'fast-check'
import { expect, test } from 'vitest'
import { epochNumber, epochText, readRfc3339 } from '../../src/feeds/times.ts'

const read = (text: string): number => {
  const bytes = Buffer.from(text)
  return readRfc3339(bytes, 0, bytes.length)
}

// The oracle is the platform's own Date.
test.for([
  ['2026-11-02T10:42:05Z', Date.UTC(2026, 10, 2, 10, 42, 5)],
  ['2026-11-02T10:42:05.5Z', Date.UTC(2026, 10, 2, 10, 42, 5, 500)],
  ['2026-11-02t10:42:05z', Date.UTC(2026, 10, 2, 10, 42, 5)],
  ['2026-11-02T10:42:05+01:00', Date.UTC(2026, 10, 2, 9, 42, 5)],
  ['2026-11-02T00:12:05.123456+05:30', Date.UTC(2026, 10, 1, 18, 42, 5) + 123.456],
  ['2026-11-02T10:42:05-08:00', Date.UTC(2026, 10, 2, 18, 42, 5)],
  ['2026-11-02', Date.UTC(2026, 10, 2)],
  ['2026-11-02 10:42:05', Date.UTC(2026, 10, 2, 10, 42, 5)],
  ['2026-11-02T10:42:05', Date.UTC(2026, 10, 2, 10, 42, 5)],
  ['2024-02-29T00:00:00Z', Date.UTC(2024, 1, 29)],
  ['2000-02-29', Date.UTC(2000, 1, 29)],
  ['2016-12-31T23:59:60Z', Date.UTC(2017, 0, 1)],
  ['1969-12-31T23:59:59.999Z', -1],
  ['1900-01-01', Date.UTC(1900, 0, 1)],
  ['2200-12-31T23:59:59Z', Date.UTC(2200, 11, 31, 23, 59, 59)],
  ['2026-11-02T10:42:05.000000000123456789Z', Date.UTC(2026, 10, 2, 10, 42, 5) + 0.000000123],
] as const)('%s is read', ([text, expected]) => {
  expect(read(text)).toBe(expected)
})

test.for([
  '',
  '2026',
  '2026-11',
  '2026-11-2',
  '20261102',
  '2026-11-02T',
  '2026-11-02T10',
  '2026-11-02T10:42',
  '2026-13-01',
  '2026-00-01',
  '2026-02-29',
  '1900-02-29',
  '2026-04-31',
  '2026-11-00',
  '2026-11-32',
  '2026-11-02T24:00:00Z',
  '2026-11-02T10:60:00Z',
  '2026-11-02T10:42:61Z',
  '2026-11-02T10:42:05.Z',
  '2026-11-02T10:42:05,5Z',
  '2026-11-02T10:42:05+0100',
  '2026-11-02T10:42:05+24:00',
  '2026-11-02T10:42:05+01:60',
  '2026-11-02T10:42:05ZZ',
  '2026-11-02T10:42:05Z ',
  ' 2026-11-02',
  '2026-11-02x10:42:05Z',
  '+002026-11-02',
  '0000-01-01',
  '275760-09-13',
  '9999-12-31',
  '1899-12-31',
  '2201-01-01',
  'now',
  '2026-11-02T10:42:05−01:00',
  '２０２６-11-02',
  '2026-1a-02',
])('"%s" is no time', (text) => {
  expect(read(text)).toBeNaN()
})

test('every millisecond of the years 1900 to 2200 is read as Date writes it', () => {
  const times = fc.date({
    min: new Date(Date.UTC(1900, 0, 1)),
    max: new Date(Date.UTC(2200, 11, 31)),
    noInvalidDate: true,
  })
  fc.assert(
    fc.property(times, (date) => {
      expect(read(date.toISOString())).toBe(date.getTime())
    }),
    { seed: 1, numRuns: 2000 },
  )
})

test('any offset shifts the time by itself', () => {
  const offsets = fc.integer({ min: -1439, max: 1439 })
  fc.assert(
    fc.property(offsets, (minutes) => {
      const sign = minutes < 0 ? '-' : '+'
      const [h, m] = [Math.floor(Math.abs(minutes) / 60), Math.abs(minutes) % 60]
      const text = `2026-06-15T12:00:00${sign}${String(h).padStart(2, '0')}:${String(m).padStart(2, '0')}`
      expect(read(text)).toBe(Date.UTC(2026, 5, 15, 12) - minutes * 60_000)
    }),
    { seed: 2 },
  )
})

test('an epoch text is the double nearest to it, in every unit', () => {
  const units = [
    ['s', 1_000n, 1n],
    ['ms', 1n, 1n],
    ['us', 1n, 1_000n],
    ['ns', 1n, 1_000_000n],
  ] as const
  const millis = fc.bigInt({ min: -2_000_000_000_000n, max: 7_000_000_000_000n })
  fc.assert(
    fc.property(millis, fc.bigInt({ min: 0n, max: 999_999n }), (ms, part) => {
      for (const [unit, per, divide] of units) {
        const count = divide === 1n ? ms : ms * divide + (part % divide)
        // Number of a decimal text is the nearest double (ECMA-262): an oracle that shares no arithmetic.
        const exact = divide === 1n ? Number(count * per) : Number(`${count}e-${String(divide).length - 1}`)
        const inside = exact >= Date.UTC(1900, 0, 1) && exact < Date.UTC(2201, 0, 1)
        expect(epochText(String(count), unit)).toBe(inside ? exact : Number.NaN)
      }
    }),
    { seed: 3, numRuns: 1000 },
  )
  expect(epochText('1700000000123456789', 'ns')).toBe(1700000000123.4568)
  expect(epochText('1700000000.123456', 's')).toBe(1700000000123.456)
})

test('epoch numbers: fractions of a second are kept to the microsecond', () => {
  expect(epochNumber(1700000000.123, 's')).toBe(1700000000123)
  expect(epochNumber(1700000000.123456, 's')).toBe(1700000000123.456)
  expect(epochNumber(1700000000123.25, 'ms')).toBe(1700000000123.25)
  expect(epochNumber(1700000000123456, 'us')).toBe(1700000000123.456)
  expect(epochNumber(1700000000123456800, 'ns')).toBeCloseTo(1700000000123.4568, 3)
})

test.for([
  '',
  ' ',
  '1e3',
  '0x10',
  '1_000',
  '+5',
  'NaN',
  'Infinity',
  '--1',
  '1.',
  '.5',
  '1,5',
  '9'.repeat(41),
])('"%s" is no epoch time', (text) => {
  expect(epochText(text, 's')).toBeNaN()
})

test.for([
  [Number.NaN, 'ms'],
  [Number.POSITIVE_INFINITY, 'ns'],
  [-1e13, 'ms'],
  [8.64e15, 'ms'],
  [1700000000000, 's'],
] as const)('the number %d in %s lies outside of the years 1900 to 2200', ([number, unit]) => {
  expect(epochNumber(number, unit)).toBeNaN()
})
