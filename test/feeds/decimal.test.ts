import fc from 'fast-check'
import { expect, test } from 'vitest'
import { NumberScanner, readDecimal } from '../../src/feeds/decimal.ts'

const scanner = new NumberScanner()

/** What the scanner makes of a text that a comma follows: the number, or undefined when it is none. */
function scan(text: string): number | undefined {
  const bytes = Buffer.from(`${text},`)
  return scanner.scan(bytes, 0) === bytes.length - 1 ? scanner.value : undefined
}

/** JSON.parse is the oracle: a number there, or nothing. */
function parsed(text: string): number | undefined {
  try {
    const value: unknown = JSON.parse(text)
    return typeof value === 'number' && text.trim() === text ? value : undefined
  } catch {
    return undefined
  }
}

test('every double, written in any usual way, is read to the bit', () => {
  fc.assert(
    fc.property(fc.double({ noNaN: true, noDefaultInfinity: true }), (x) => {
      for (const text of [JSON.stringify(x), x.toExponential(), x.toPrecision(17)])
        expect(scan(text)).toBe(parsed(text))
    }),
    { seed: 1, numRuns: 3000 },
  )
})

test('digits with a point anywhere are read as JSON.parse reads them', () => {
  const digits = fc.stringMatching(/^-?[0-9]{1,25}(\.[0-9]{1,30})?([eE][+-]?[0-9]{1,3})?$/)
  fc.assert(
    fc.property(digits, (text) => {
      expect(scan(text)).toBe(parsed(text))
    }),
    { seed: 2, numRuns: 5000 },
  )
})

test('what is no JSON number is none here', () => {
  const marks = fc.string({ unit: fc.constantFrom(...'0019.-+eE '), maxLength: 8 })
  fc.assert(
    fc.property(marks, (text) => {
      expect(scan(text)).toBe(parsed(text))
    }),
    { seed: 3, numRuns: 5000 },
  )
})

test.for([
  ['9007199254740991', 9007199254740991],
  ['9007199254740993', 9007199254740992],
  ['0.000000000000000000000000000001', 1e-30],
  ['123456789012345678', 123456789012345680],
  ['1e400', Number.POSITIVE_INFINITY],
  ['-0', -0],
  ['5e-324', 5e-324],
  ['2.2250738585072011e-308', 2.225073858507201e-308],
  ['8.98846567431158e307', 8.98846567431158e307],
] as const)('%s', ([text, expected]) => {
  expect(scan(text)).toBe(expected)
})

test.for([
  ['1.5', 1.5],
  [' -2e3 ', -2000],
  ['+7', 7],
  ['.5', 0.5],
  ['5.', 5],
  ['007', 7],
] as const)('the cell "%s" is a number', ([text, expected]) => {
  expect(readDecimal(text)).toBe(expected)
})

test.for([
  '',
  'NaN',
  'nan',
  'Infinity',
  '-inf',
  '0x1F',
  '1_000',
  '1,5',
  '1 000',
  '1.2.3',
  '--1',
  'e5',
  '1e',
  '٣',
])('the cell "%s" is no number', (text) => {
  expect(readDecimal(text)).toBeNaN()
})
