import fc from 'fast-check'
import { expect, test } from 'vitest'
import { badName, NameTable, tooManyNames } from '../../src/feeds/name-table.ts'

test('a name keeps its number, and different names have different ones', () => {
  const names = fc.array(fc.string({ unit: 'grapheme', minLength: 1, maxLength: 20 }), { maxLength: 300 })
  fc.assert(
    fc.property(names, (list) => {
      const table = new NameTable()
      const numbers = new Map<string, number>()
      for (const name of [...list, ...list]) {
        const number = table.internText(name)
        if (number < 0) continue
        expect(numbers.get(name) ?? number).toBe(number)
        numbers.set(name, number)
        expect(table.names[number]).toBe(name)
        const bytes = Buffer.from(`.${name}.`)
        expect(table.find(bytes, 1, bytes.length - 1)).toBe(number)
      }
      expect(new Set(numbers.values()).size).toBe(table.names.length)
      expect(table.names.length).toBe(numbers.size)
    }),
    { seed: 1, numRuns: 200 },
  )
})

test('twenty thousand names are told apart, and no more are taken', () => {
  const table = new NameTable()
  for (let i = 0; i < 20_000; i++) expect(table.internText(`SIGNAL-${i}`)).toBe(i)
  expect(table.internText('one-more')).toBe(tooManyNames)
  for (let i = 0; i < 20_000; i += 97) expect(table.internText(`SIGNAL-${i}`)).toBe(i)
  expect(table.names).toHaveLength(20_000)
})

test('names with the same hash are told apart', () => {
  // 31·a + b is the same for "Aa" and "BB", and so for every word made of the two.
  const table = new NameTable()
  const words = Array.from({ length: 1024 }, (_, i) =>
    [...i.toString(2).padStart(10, '0')].map((bit) => (bit === '0' ? 'Aa' : 'BB')).join(''),
  )
  for (const [i, word] of words.entries()) expect(table.internText(word)).toBe(i)
  for (const [i, word] of words.entries()) expect(table.internText(word)).toBe(i)
})

test.for([
  ['empty', ''],
  ['201 characters', 'x'.repeat(201)],
  ['a tab', 'a\tb'],
  ['a NUL', 'a\0'],
  ['DEL', 'a\x7f'],
  ['a C1 control', 'a\x85'],
  ['a lone surrogate', 'a\ud800'],
  ['a replacement character', 'a\ufffd'],
] as const)('no name: %s', ([, name]) => {
  const table = new NameTable()
  expect(table.internText(name)).toBe(badName)
  const bytes = Buffer.from(name)
  expect(table.intern(bytes, 0, bytes.length)).toBe(badName)
  expect(table.names).toEqual([])
})

test('200 characters of any script are a name; bytes that are no UTF-8 are none', () => {
  const table = new NameTable()
  expect(table.internText('漢'.repeat(200))).toBe(0)
  expect(table.intern(Buffer.from([0x41, 0xff]), 0, 2)).toBe(badName)
  expect(table.intern(Buffer.from([0xe6, 0xbc]), 0, 2)).toBe(badName)
  expect(table.intern(Buffer.from([0xc0, 0xaf]), 0, 2)).toBe(badName)
})
