import type { Case, CaseGroup } from './case.ts'

const packs: readonly (readonly [string, unknown, Case[2]])[] = [
  ['an object instead of an array', { n: 'a', v: 1 }, { unreadable: 1 }],
  ['an empty pack', [], {}],
  ['an empty record', [{}], {}],
  ['numbers as records', [1, 2], { unreadable: 1 }],
  ['a null record spoils the pack', [{ n: 'a', v: 1 }, null], { unreadable: 1 }],
  ['a nested pack', [[{ n: 'a', v: 1 }]], { unreadable: 1 }],
  ['version 99', [{ bver: 99, n: 'a', v: 1 }], { unreadable: 1 }],
  ['version 10', [{ bver: 10, n: 'a', v: 1 }], { readings: 1 }],
  ['a label that must be understood', [{ n: 'a', v: 1, secret_: 1 }], { unreadable: 1 }],
  ['a label that need not be understood', [{ n: 'a', v: 1, secret: 1 }], { readings: 1 }],
  ['no name', [{ v: 1 }], { 'bad-signal': 1 }],
  ['an empty name under an empty base name', [{ bn: '', n: '', v: 1 }], { 'bad-signal': 1 }],
  ['a name that is a number', [{ n: 5, v: 1 }], { 'bad-signal': 1 }],
  [
    'base and name together longer than 200',
    [{ bn: 'x'.repeat(150), n: 'y'.repeat(51), v: 1 }],
    { 'bad-signal': 1 },
  ],
  ['a base name that is a number', [{ bn: 5, n: 'a', v: 1 }], { unreadable: 1 }],
  ['a base time that is a text', [{ bt: 'now', n: 'a', v: 1 }], { unreadable: 1 }],
  ['a base time that is null', [{ bt: null, n: 'a', v: 1 }], { unreadable: 1 }],
  ['a base value that is true', [{ bv: true, n: 'a', v: 1 }], { unreadable: 1 }],
  ['a value that is a text', [{ n: 'a', v: '1' }], { 'bad-value': 1 }],
  ['a value that is null', [{ n: 'a', v: null }], { 'bad-value': 1 }],
  ['two values', [{ n: 'a', v: 1, vs: 'x' }], { unreadable: 1 }],
  ['no value', [{ n: 'a' }], { unreadable: 1 }],
  ['a text value', [{ n: 'a', vs: 'open' }], { 'bad-value': 1 }],
  ['data', [{ n: 'a', vd: 'AAAA' }], { 'bad-value': 1 }],
  ['a sum alone', [{ n: 'a', s: 5 }], { 'bad-value': 1 }],
  ['a truth value that is a text', [{ n: 'a', vb: 'true' }], { 'bad-value': 1 }],
  ['base and value beyond all numbers', [{ n: 'a', bv: 1.7e308, v: 1.7e308 }], { 'bad-value': 1 }],
  ['a time that is a text', [{ n: 'a', t: '5', v: 1 }], { 'bad-time': 1 }],
  ['a time in milliseconds', [{ n: 'a', t: 1.7e12, v: 1 }], { 'bad-time': 1 }],
  ['a time 200 years ago, relative', [{ n: 'a', t: -6.4e9, v: 1 }], { 'bad-time': 1 }],
  ['a base name __proto__', [{ bn: '__proto__', v: 1 }], { readings: 1 }],
]

export const senmlGroups: readonly CaseGroup[] = [
  {
    title: 'SenML',
    format: 'senml',
    cases: [
      ...packs.map(([title, pack, expected]): Case => [title, JSON.stringify(pack), expected]),
      ['a pack cut off', '[{"n":"a","v":1},{"n":"b"', { unreadable: 1 }],
      ['1e400', '[{"n":"a","v":1e400}]', { 'bad-value': 1 }],
      ['a time of 1e400', '[{"n":"a","t":1e400,"v":1}]', { 'bad-time': 1 }],
      [
        '__proto__ as a label (it ends in an underscore)',
        '[{"__proto__":{"n":"a"},"v":1}]',
        { unreadable: 1 },
      ],
      ['a pack over several lines', '[\n{"n":"a","v":1}\n]', { unreadable: 3 }],
    ],
  },
]
