import { expect, inject, test } from 'vitest'
import { defaultClock } from '../../demo-feeds/demo-feed.ts'
import { readingsOf } from '../../demo-feeds/demo-options.ts'
import { produce } from '../../demo-feeds/produce.ts'
import { readingJson } from '../../demo-feeds/recorded.ts'
import { until } from '../support/host.ts'
import { kafkaClient, uniqueName } from './support/kafka-client.ts'

test('the producer makes the topic and sends every reading once, a signal always to one partition', async () => {
  const topic = uniqueName('ticks')
  const clock = { ...defaultClock, frames: 12 }
  const production = { brokers: [inject('kafka')], topic, partitions: 4, speed: 0, compress: true }
  const sent = await produce(production, readingsOf('desk', clock))

  const expected = [...readingsOf('desk', clock)].flatMap((chunk) =>
    Array.from({ length: chunk.count }, (_, i) => readingJson(chunk, i)),
  )
  expect(sent).toBe(expected.length)

  const got: { partition: number; key: string; value: string }[] = []
  const consumer = kafkaClient(inject('kafka')).consumer({
    groupId: uniqueName('reader'),
    maxWaitTimeInMs: 100,
  })
  await consumer.connect()
  await consumer.subscribe({ topic, fromBeginning: true })
  await consumer.run({
    eachMessage: async ({ partition, message }) => {
      got.push({ partition, key: String(message.key), value: String(message.value) })
    },
  })
  await until('all readings', async () => got.length >= sent)
  await consumer.disconnect()

  expect(got.map(({ value }) => value).sort()).toEqual([...expected].sort())
  expect(got.every(({ key, value }) => JSON.parse(value).signal === key)).toBe(true)
  const places = new Set(got.map(({ key, partition }) => `${key} ${partition}`))
  expect(places.size).toBe(48)
  expect(new Set(got.map(({ partition }) => partition))).toEqual(new Set([0, 1, 2, 3]))
  for (const partition of [0, 1, 2, 3]) {
    const inPartition = got.filter((message) => message.partition === partition)
    const keys = new Set(inPartition.map(({ key }) => key))
    expect(inPartition.map(({ value }) => value)).toEqual(
      expected.filter((value) => keys.has(JSON.parse(value).signal)),
    )
  }
})

test('at a speed the producer keeps to it, and stops when told', async () => {
  const topic = uniqueName('paced')
  const production = { brokers: [inject('kafka')], topic, partitions: 1, speed: 100, compress: false }
  const stop = new AbortController()
  const chunks = readingsOf('station', { ...defaultClock, frames: 100_000 })
  const running = produce(production, chunks, stop.signal)
  setTimeout(() => stop.abort(), 1500)
  // 20 frames of 43.9 readings a second of wall time; it cannot have run ahead of that.
  const sent = await running
  expect(sent).toBeGreaterThan(0)
  expect(sent).toBeLessThan(1.5 * 20 * 44 + 3 * 44)
})
