import { describe, expect, test } from 'vitest'
import { Watermarks } from '../../src/frames/watermarks.ts'

const idleAfter = 30_000

function three(): Watermarks {
  const marks = new Watermarks(idleAfter)
  for (const name of ['a', 'b', 'c']) marks.assign(name, 0)
  return marks
}

describe('watermarks', () => {
  test('a source that was assigned but has not spoken holds the clock', () => {
    const marks = three()
    marks.source('a', 0).latest = 100
    marks.source('b', 0).latest = 50
    expect(marks.reached(1_000_000)).toBe(Number.NEGATIVE_INFINITY)
    marks.source('c', 0).latest = 70
    expect(marks.reached(1_000_000)).toBe(50)
  })

  test('only a source that is caught up and silent for so long falls idle', () => {
    const marks = three()
    marks.source('a', 0).latest = 100
    marks.source('b', 0).latest = 50
    expect(marks.reached(idleAfter)).toBe(Number.NEGATIVE_INFINITY)
    marks.source('c', 0).caughtUp = true
    expect(marks.reached(idleAfter - 1)).toBe(Number.NEGATIVE_INFINITY)
    expect(marks.reached(idleAfter)).toBe(50)
  })

  test('ended sources do not hold; when all have ended the clock is at infinity', () => {
    const marks = three()
    marks.source('a', 0).latest = 100
    marks.source('b', 0).ended = true
    marks.source('c', 0).ended = true
    expect(marks.reached(0)).toBe(100)
    marks.source('a', 0).ended = true
    expect(marks.reached(0)).toBe(Number.POSITIVE_INFINITY)
    expect(marks.furthest).toBe(100)
  })

  test('a source that begins again after all had ended brings the clock back to where it was', () => {
    const marks = new Watermarks(idleAfter)
    marks.source('a', 0).latest = 100
    marks.reached(0)
    marks.source('a', 0).ended = true
    expect(marks.reached(0)).toBe(Number.POSITIVE_INFINITY)
    marks.assign('a', 0)
    expect(marks.reached(0)).toBe(100)
  })

  test('when all are idle the clock rests, and never goes back when one comes that is behind', () => {
    const marks = new Watermarks(idleAfter)
    Object.assign(marks.source('a', 0), { latest: 100, caughtUp: true })
    expect(marks.reached(0)).toBe(100)
    expect(marks.reached(idleAfter)).toBe(100)
    marks.assign('b', idleAfter)
    marks.source('b', idleAfter).latest = 20
    expect(marks.reached(idleAfter)).toBe(100)
  })

  test('a revoked source no longer holds the clock', () => {
    const marks = three()
    marks.source('a', 0).latest = 100
    marks.source('b', 0).latest = 60
    marks.remove('c')
    expect(marks.reached(0)).toBe(60)
  })

  test('after a restart an assigned source holds the clock again, however long the monitor was away', () => {
    const before = new Watermarks(idleAfter)
    Object.assign(before.source('a', 0), { latest: 100, caughtUp: true })
    Object.assign(before.source('b', 0), { latest: 90, caughtUp: true })
    before.reached(0)
    const after = new Watermarks(idleAfter)
    after.restore(structuredClone(before.snapshot()))
    const hourLater = 3_600_000
    after.assign('a', hourLater)
    after.assign('b', hourLater)
    Object.assign(after.source('a', hourLater), { latest: 500, spoke: hourLater + idleAfter })
    expect(after.reached(hourLater + idleAfter)).toBe(90)
  })
})
