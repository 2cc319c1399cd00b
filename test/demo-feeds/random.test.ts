import { expect, test } from 'vitest'
import { Random } from '../support/random.ts'

const draw = (count: number, one: () => number) => Float64Array.from({ length: count }, one)
const mean = (values: Float64Array) => values.reduce((sum, value) => sum + value, 0) / values.length
const moment = (values: Float64Array, order: number) => mean(values.map((value) => value ** order))

test('the same seed gives the same numbers, another seed others', () => {
  const first = new Random(5)
  const again = new Random(5)
  const numbers = draw(100, () => first.uniform())
  expect(draw(100, () => again.uniform())).toEqual(numbers)
  const other = new Random(6)
  expect(draw(100, () => other.uniform())).not.toEqual(numbers)
})

test('uniform numbers have mean 1/2 and variance 1/12, and stay inside (0, 1)', () => {
  const random = new Random(1)
  const values = draw(200_000, () => random.uniform())
  // Standard errors: 0.00065 and 0.00017.
  expect(Math.abs(mean(values) - 1 / 2)).toBeLessThan(0.003)
  expect(Math.abs(moment(values, 2) - 1 / 3)).toBeLessThan(0.003)
  expect(values.every((value) => value > 0 && value < 1)).toBe(true)
})

test('normal numbers have the moments 0, 1, 0, 3 and no correlation between neighbours', () => {
  const random = new Random(2)
  const values = draw(200_000, () => random.normal())
  expect(Math.abs(mean(values))).toBeLessThan(0.012)
  expect(Math.abs(moment(values, 2) - 1)).toBeLessThan(0.016)
  expect(Math.abs(moment(values, 3))).toBeLessThan(0.045)
  expect(Math.abs(moment(values, 4) - 3)).toBeLessThan(0.11)
  const neighbours = values.subarray(1).map((value, i) => value * values[i]!)
  expect(Math.abs(mean(neighbours))).toBeLessThan(0.012)
})

test('fat-tailed numbers exceed the quantiles of t with 4 degrees as often as they should', () => {
  const random = new Random(3)
  const values = draw(200_000, () => Math.abs(random.fatTailed()) * Math.SQRT2)
  const beyond = (limit: number) => values.filter((value) => value > limit).length / values.length
  // Two-sided points of t(4) from any table: 2.776 (5 %), 4.604 (1 %), 8.610 (0.1 %).
  expect(Math.abs(beyond(2.776) - 0.05)).toBeLessThan(0.002)
  expect(Math.abs(beyond(4.604) - 0.01)).toBeLessThan(0.001)
  expect(Math.abs(beyond(8.61) - 0.001)).toBeLessThan(0.0003)
})

test('a permutation holds every number once', () => {
  const order = new Random(4).permutation(50)
  expect([...order].sort((a, b) => a - b)).toEqual(Array.from({ length: 50 }, (_, i) => i))
  expect([...order]).not.toEqual([...order].sort((a, b) => a - b))
})
