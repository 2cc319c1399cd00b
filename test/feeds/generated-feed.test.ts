import { expect, test } from 'vitest'
import { type GeneratedChunk, GeneratedFeed } from '../../src/feeds/generated-feed.ts'
import { Collected } from './support/collected.ts'
import { FakeTimer, settled } from './support/fake-timer.ts'

const names = ['A', 'B']

/** One chunk a second of event time, each with one reading. */
const chunks = (count: number): GeneratedChunk[] =>
  Array.from({ length: count }, (_, i) => ({
    count: 1,
    names,
    signal: Int32Array.of(i % 2),
    time: Float64Array.of(1000 * i + 500),
    value: Float64Array.of(i),
    until: 1000 * (i + 1),
  }))

test('chunks come when they are due at the speed stated', async () => {
  const timer = new FakeTimer()
  const got = new Collected(new GeneratedFeed('desk', chunks(5), 10, { timer }))
  await timer.pass(0)
  expect(got.readings).toHaveLength(1)
  await timer.pass(99)
  expect(got.readings).toHaveLength(1)
  await timer.pass(1)
  expect(got.readings).toHaveLength(2)
  await timer.pass(300)
  expect(got.readings.map(({ signal, time, value, source }) => [signal, time, value, source])).toEqual([
    ['A', 500, 0, 'desk'],
    ['B', 1500, 1, 'desk'],
    ['A', 2500, 2, 'desk'],
    ['B', 3500, 3, 'desk'],
    ['A', 4500, 4, 'desk'],
  ])
  await settled()
  expect(got.events.filter((type) => type !== 'batch')).toEqual([
    'connected',
    'assigned',
    'caught-up',
    'ended',
  ])
  expect(got.completed).toBe(true)
})

test('the speed may be changed while it plays: what is left is played at the new one', async () => {
  const timer = new FakeTimer()
  const feed = new GeneratedFeed('desk', chunks(100), 1, { timer })
  const got = new Collected(feed)
  await timer.pass(500)
  expect(got.readings).toHaveLength(1)
  feed.speed = 5
  await timer.pass(99)
  expect(got.readings).toHaveLength(1)
  await timer.pass(1)
  expect(got.readings).toHaveLength(2)
  await timer.pass(200)
  expect(got.readings).toHaveLength(3)
  feed.speed = 0
  await timer.pass(1e9)
  expect(got.readings).toHaveLength(3)
  feed.speed = 1
  await timer.pass(999)
  expect(got.readings).toHaveLength(3)
  await timer.pass(1)
  expect(got.readings).toHaveLength(4)
  feed.speed = Number.POSITIVE_INFINITY
  await settled()
  await got.ended
  expect(got.readings).toHaveLength(100)
  expect(() => {
    feed.speed = -1
  }).toThrow(RangeError)
})

test('as fast as it can: one batch in flight, nothing waits', async () => {
  let flying = 0
  const got = new Collected(new GeneratedFeed('desk', chunks(200), Number.POSITIVE_INFINITY), async () => {
    expect(++flying).toBe(1)
    await Promise.resolve()
    flying--
  })
  await got.ended
  expect(got.readings.map(({ value }) => value)).toEqual(Array.from({ length: 200 }, (_, i) => i))
})

test('a listener that was away is not chased with what it missed', async () => {
  const timer = new FakeTimer()
  let release = () => {}
  const got = new Collected(new GeneratedFeed('desk', chunks(1000), 10, { timer }), async ({ batch }) => {
    if (batch.value[0] === 3)
      await new Promise<void>((resolve) => {
        release = resolve
      })
  })
  await timer.pass(300)
  await timer.pass(60_000)
  release()
  await timer.pass(0)
  const before = got.readings.length
  await timer.pass(1000)
  expect(got.readings.length - before).toBe(10)
})

test('held, it gives nothing; stopped, it ends without another batch', async () => {
  const timer = new FakeTimer()
  const feed = new GeneratedFeed('desk', chunks(100), 10, { timer })
  const got = new Collected(feed)
  await timer.pass(100)
  feed.hold('another', true)
  await timer.pass(100)
  expect(got.readings).toHaveLength(3)
  feed.hold('desk', true)
  await timer.pass(5000)
  expect(got.readings).toHaveLength(3)
  feed.hold('desk', false)
  await timer.pass(0)
  const released = got.readings.length
  expect(released).toBeLessThanOrEqual(5)
  await timer.pass(1000)
  expect(got.readings).toHaveLength(released + 10)
  got.stop()
  await timer.pass(10_000)
  expect(got.readings).toHaveLength(released + 10)
  expect(got.completed).toBe(false)
})
