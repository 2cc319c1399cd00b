import { expect, test } from 'vitest'
import { pointAt, pointerSteps } from '../../src/feeds/pointer.ts'

// RFC 6901, section 5 (document and values from memory).
const example = JSON.parse(
  '{"foo":["bar","baz"],"":0,"a/b":1,"c%d":2,"e^f":3,"g|h":4,"i\\\\j":5,"k\\"l":6," ":7,"m~n":8}',
)

test.for([
  ['', example],
  ['/foo', ['bar', 'baz']],
  ['/foo/0', 'bar'],
  ['/', 0],
  ['/a~1b', 1],
  ['/c%d', 2],
  ['/e^f', 3],
  ['/g|h', 4],
  ['/i\\j', 5],
  ['/k"l', 6],
  ['/ ', 7],
  ['/m~0n', 8],
] as const)('the pointer "%s" of RFC 6901', ([pointer, expected]) => {
  expect(pointAt(example, pointerSteps(pointer))).toEqual(expected)
})

test('~01 is ~1, not a slash', () => {
  expect(pointAt({ '~1': 'right', '/': 'wrong' }, pointerSteps('/~01'))).toBe('right')
})

test.for([
  '/nothing',
  '/foo/2',
  '/foo/-',
  '/foo/00',
  '/foo/01',
  '/foo/length',
  '/foo/0/x',
  '/toString',
  '/__proto__',
  '/constructor/name',
  '/foo/-1',
  '/foo/1e0',
])('nothing is at "%s"', (pointer) => {
  expect(pointAt(example, pointerSteps(pointer))).toBeUndefined()
})

test('a member that is called __proto__ is a member like any other', () => {
  expect(pointAt(JSON.parse('{"__proto__":{"x":1}}'), pointerSteps('/__proto__/x'))).toBe(1)
  expect(pointAt({}, pointerSteps('/__proto__/x'))).toBeUndefined()
})
