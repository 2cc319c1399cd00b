import fc from 'fast-check'
import { expect, test } from 'vitest'
import { BatchBuilder } from '../../src/feeds/batch-builder.ts'
import { NameTable } from '../../src/feeds/name-table.ts'
import { PartitionLane } from '../../src/feeds/partition-lane.ts'
import { readerFor } from '../../src/feeds/reader-for.ts'
import type { DropCounts } from '../../src/reasons.ts'
import { recordBatch, unpack } from './support/record-batches.ts'

const reading = (i: number) => `{"signal":"A","time":${1_700_000_000_000 + i},"value":${i}}`
const numbers = (from: number, to: number) => Array.from({ length: to - from }, (_, i) => from + i)

function laneAt(next: bigint, size = 1000) {
  const names = new NameTable()
  const out = new BatchBuilder('ticks', 'ticks/0', names, () => 5, size)
  return new PartitionLane('ticks/0', 0, { next, end: next }, out, readerFor('ndjson', 1 << 20, names))
}

/** Empties the lane; gives the values, the positions after each batch and the drops. */
function drain(lane: PartitionLane) {
  const values: number[] = []
  const positions: bigint[] = []
  const drops: DropCounts[] = []
  const places: string[] = []
  while (!lane.isEmpty) {
    lane.fill()
    values.push(...lane.out.value.subarray(0, lane.out.count))
    positions.push(lane.next)
    drops.push(lane.out.dropped)
    places.push(...lane.out.quarantined.map(({ position, reason }) => `${position} ${reason}`))
    lane.out.reset()
  }
  return { values, positions, drops, places }
}

test.for([0, 1])(
  'record batches as a producer writes them are walked (compression %i)',
  async (compression) => {
    const lane = laneAt(40n)
    const first = await recordBatch(40, numbers(40, 50).map(reading), compression)
    const second = await recordBatch(50, numbers(50, 300).map(reading), compression)
    lane.take(await unpack(first, second), 300n)
    expect(lane.fetched).toBe(300n)
    expect(lane.next).toBe(40n)
    expect(lane.bytes).toBeGreaterThan(0)
    expect(drain(lane)).toMatchObject({ values: numbers(40, 300), positions: [300n], drops: [{}] })
    expect(lane.bytes).toBe(0)
  },
)

test('a batch is given out in parts, each with the offset behind it', async () => {
  const lane = laneAt(0n, 4)
  lane.take(await unpack(await recordBatch(0, numbers(0, 10).map(reading))), 10n)
  expect(drain(lane)).toMatchObject({ values: numbers(0, 10), positions: [4n, 8n, 10n] })
})

test('what is fetched again is not given out again', async () => {
  const batches = await Promise.all(
    [0, 10, 20].map((base) => recordBatch(base, numbers(base, base + 10).map(reading))),
  )
  const lane = laneAt(13n)
  lane.take(await unpack(...batches.slice(0, 2)), 20n)
  lane.take(await unpack(...batches), 30n)
  expect(drain(lane).values).toEqual(numbers(13, 30))
  lane.take(await unpack(...batches), 30n)
  expect(drain(lane).values).toEqual([])
  expect(lane.next).toBe(30n)
})

test('what was cleared is asked for again, from the first offset not yet given out', async () => {
  const lane = laneAt(0n, 4)
  const messages = await unpack(await recordBatch(0, numbers(0, 10).map(reading)))
  lane.take(messages, 10n)
  lane.fill()
  lane.out.reset()
  lane.clear()
  expect([lane.next, lane.fetched, lane.bytes, lane.isEmpty]).toEqual([4n, 4n, 0, true])
  lane.take(messages, 10n)
  expect(drain(lane).values).toEqual(numbers(4, 10))
})

test('compressed data that are damaged are counted by their records, and passed over', async () => {
  const good = await recordBatch(0, numbers(0, 5).map(reading), 1)
  const bad = await recordBatch(5, numbers(5, 12).map(reading), 1)
  bad.fill(0x55, 75, 95)
  const after = await recordBatch(12, [reading(12)])
  const lane = laneAt(0n)
  lane.take(await unpack(good, bad, after), 13n)
  expect(drain(lane)).toMatchObject({
    values: [0, 1, 2, 3, 4, 12],
    drops: [{ 'bad-compression': 7 }],
    places: ['5 bad-compression'],
  })
  expect(lane.next).toBe(13n)
})

test('a batch whose records break off is read as far as it goes', async () => {
  const batch = await recordBatch(0, numbers(0, 5).map(reading))
  batch.fill(0xff, batch.length - 120)
  const lane = laneAt(0n)
  lane.take(await unpack(batch), 5n)
  const { values, drops } = drain(lane)
  expect(values).toEqual(numbers(0, values.length))
  expect(drops[0]!.unreadable).toBe(5 - values.length)
  expect(values.length).toBeGreaterThan(1)
  expect(lane.next).toBe(5n)
})

test('messages without a value, empty ones, and offsets beyond 2^53, keep their places', async () => {
  const base = 2n ** 60n
  const batch = await recordBatch(0, [reading(1), null, reading(2), '{', ''])
  batch.writeBigInt64BE(base)
  const lane = laneAt(base)
  lane.take(await unpack(batch), base + 5n)
  expect(drain(lane)).toMatchObject({
    values: [1, 2],
    places: [1n, 3n, 4n].map((delta) => `${base + delta} unreadable`),
  })
  expect(lane.next).toBe(base + 5n)
})

test('offsets left out by compaction or taken by control records do not hold the place back', async () => {
  const lane = laneAt(0n)
  lane.take(await unpack(await recordBatch(0, [reading(0)])), 7n)
  drain(lane)
  expect(lane.next).toBe(7n)
  lane.passTo(9n)
  expect([lane.next, lane.fetched]).toEqual([9n, 9n])
})

test('whatever bytes stand in a record batch, walking it ends and throws nothing', async () => {
  const batch = await recordBatch(0, numbers(0, 20).map(reading))
  const hits = fc.array(
    fc.tuple(fc.integer({ min: 57, max: batch.length - 1 }), fc.integer({ min: 0, max: 255 })),
    { minLength: 1, maxLength: 6 },
  )
  await fc.assert(
    fc.asyncProperty(hits, async (changes) => {
      const damaged = Buffer.from(batch)
      for (const [at, byte] of changes) damaged[at] = byte
      const lane = laneAt(0n)
      lane.take(await unpack(damaged), 20n)
      const { values } = drain(lane)
      expect(values.length).toBeLessThanOrEqual(20)
      expect(lane.next).toBe(20n)
    }),
    { seed: 1, numRuns: 1000 },
  )
})
