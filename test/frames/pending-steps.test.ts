import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { PendingSteps } from '../../src/frames/pending-steps.ts'

const shape = (key: number) => ({ from: 10 * key, until: 10 * key + 10, inSession: true })
const keysOf = (steps: PendingSteps): number[] => steps.snapshot().map(({ key }) => key)
const drained = (steps: PendingSteps): number[] => {
  const keys: number[] = []
  for (let step = steps.shift(); step !== undefined; step = steps.shift()) keys.push(step.key)
  return keys
}

describe('waiting steps', () => {
  test('come out in the order of their keys, whatever was opened and taken away in between', () => {
    // A number opens its key unless it waits already; null takes the first away.
    const act = fc.oneof({ weight: 3, arbitrary: fc.integer({ min: -60, max: 60 }) }, fc.constant(null))
    fc.assert(
      fc.property(fc.array(act, { maxLength: 120 }), (acts) => {
        const steps = new PendingSteps(1000, 1_000_000, shape)
        let model: number[] = []
        for (const key of acts) {
          if (key === null) {
            expect(steps.shift()?.key).toBe(model[0])
            model = model.slice(1)
          } else if (steps.find(key) === undefined) {
            expect(model).not.toContain(key)
            expect(steps.open(key, 2)?.key).toBe(key)
            model = [...model, key].sort((a, b) => a - b)
          } else expect(model).toContain(key)
          expect(steps.count).toBe(model.length)
          expect(steps.first?.key).toBe(model[0])
          expect(steps.countWithin(-100, 200)).toBe(
            model.filter((open) => 10 * open > -100 && 10 * open <= 200).length,
          )
        }
        expect(keysOf(steps)).toEqual(model)
        expect(drained(steps)).toEqual(model)
      }),
      { seed: 12, numRuns: 200 },
    )
  })

  test('a long backlog comes out whole, also while later and earlier steps are opened', () => {
    const steps = new PendingSteps(10_000, 1_000_000, shape)
    for (let key = 0; key < 3000; key++) steps.open(key, 1)
    const out: number[] = []
    for (let k = 0; k < 1500; k++) {
      out.push(steps.shift()!.key)
      steps.open(3000 + k, 1)
    }
    expect(out).toEqual(Array.from({ length: 1500 }, (_, k) => k))
    expect(steps.count).toBe(3000)
    expect(steps.find(1499)).toBeUndefined()
    expect(steps.find(1500)?.key).toBe(1500)
    steps.open(7, 1)
    expect(steps.first?.key).toBe(7)
    const restored = new PendingSteps(10_000, 1_000_000, shape)
    restored.restore(structuredClone(steps.snapshot()))
    const rest = [7, ...Array.from({ length: 3000 }, (_, k) => 1500 + k)]
    expect(drained(steps)).toEqual(rest)
    expect(drained(restored)).toEqual(rest)
  })

  test('a step that is used again holds nothing of what it held', () => {
    const steps = new PendingSteps(10, 1000, shape)
    const first = steps.open(1, 3)!
    first.time.fill(12)
    first.value.fill(5)
    expect(steps.readings).toBe(3)
    expect(steps.shift()?.key).toBe(1)
    expect(steps.readings).toBe(0)
    expect(steps.open(2, 3)!.time).toEqual(new Float64Array(3).fill(Number.NEGATIVE_INFINITY))
    expect(steps.readings).toBe(0)
  })

  test('are refused beyond their number, and beyond their places over all; one may always wait', () => {
    const few = new PendingSteps(2, 1000, shape)
    expect([1, 2, 3].map((key) => few.open(key, 1)?.key ?? null)).toEqual([1, 2, null])
    few.shift()
    expect(few.open(3, 1)?.key).toBe(3)
    const narrow = new PendingSteps(100, 10, shape)
    expect([1, 2, 3].map((key) => narrow.open(key, 4)?.key ?? null)).toEqual([1, 2, null])
    expect(new PendingSteps(100, 10, shape).open(1, 50)?.key).toBe(1)
  })
})
