import { Readable } from 'node:stream'
import { setFlagsFromString } from 'node:v8'
import { runInNewContext } from 'node:vm'
import { gzipSync } from 'node:zlib'
import { expect, test } from 'vitest'
import { openFeed } from '../../src/feeds/open-feed.ts'
import { addDrops, type DropCounts } from '../../src/reasons.ts'
import { readMessage } from './support/read.ts'
import { cases, cut, formats, inputOf, play } from './support/rubbish-corpus.ts'

const t = 1_700_000_000_000
const good = Buffer.from(`{"signal":"A","time":${t},"value":1}\n`)
const mebi = 2 ** 20
const limit = 64 * 1024
const kibi = Buffer.alloc(1024, 'x')

setFlagsFromString('--expose-gc')
const collect: () => void = runInNewContext('gc')

/** Bytes that the process holds for its objects and buffers, after a clean-up. */
function held(): number {
  collect()
  const { heapUsed, external } = process.memoryUsage()
  return heapUsed + external
}

function* repeat(times: number, ...pieces: readonly Buffer[]): Generator<Buffer> {
  for (let k = 0; k < times; k++) yield* pieces
}

/** Passes pieces on and notes the most memory held on the way, above that of the beginning. */
class Watched implements Iterable<Buffer> {
  most = 0
  readonly #pieces: Iterable<Buffer>

  constructor(pieces: Iterable<Buffer>) {
    this.#pieces = pieces
  }

  *[Symbol.iterator](): Generator<Buffer> {
    const before = held()
    let given = 0
    for (const piece of this.#pieces) {
      given += piece.length
      if (given > 4 * mebi) {
        this.most = Math.max(this.most, held() - before)
        given = 0
      }
      yield piece
    }
  }
}

test('a line of 10 MB is skipped without being held', async () => {
  const head = Buffer.from('{"signal":"')
  const pieces = [good, head, ...repeat(10 * 1024, kibi), Buffer.from('"}\n'), good]
  const watched = new Watched(repeat(3, ...pieces))
  const heard = await play('ndjson', watched, limit)
  expect(heard.readings).toHaveLength(6)
  expect(heard.dropped).toEqual({ 'too-long': 3 })
  expect(heard.quarantined.map(({ position }) => position)).toEqual(['2', '5', '8'])
  expect(heard.quarantined[0]?.start).toHaveLength(200)
  expect(watched.most).toBeLessThan(8 * mebi)
})

test('10 MB of nothing but brackets, quotation marks, NUL bytes or commas are skipped too', async () => {
  for (const format of ['ndjson', 'senml', 'readings'] as const)
    for (const filler of ['[', '"', '\0', '{"":', ' ']) {
      const pieces = [...repeat(10, Buffer.alloc(mebi, filler)), Buffer.from('\n')]
      expect((await play(formats[format], pieces, limit)).dropped).toEqual({ 'too-long': 1 })
    }
  const header = Buffer.from('date,A\n')
  for (const filler of [',', '"', 'x', '""']) {
    const pieces = [header, ...repeat(10, Buffer.alloc(mebi, filler)), Buffer.from('\n2026-01-02,1\n')]
    const heard = await play(formats.wide, pieces, limit)
    expect(heard.dropped).toEqual({ 'too-long': 1 })
    expect(heard.readings).toHaveLength(1)
  }
})

test('an array of 100,000 readings in one record is read whole, a bad one among them counted', () => {
  const reading = (k: number) => `{"s":"S${k % 100}","t":${t + k},"v":${k === 500 ? 'null' : k}}`
  const message = Buffer.from(`{"data":[${Array.from({ length: 100_000 }, (_, k) => reading(k)).join()}]}`)
  const outcome = readMessage(formats.readings, message, { limit: 16 * mebi })
  expect(outcome.readings).toHaveLength(99_999)
  expect(outcome.dropped).toEqual({ 'bad-value': 1 })
  expect(readMessage(formats.readings, message, { limit }).dropped).toEqual({ 'too-long': 1 })
})

test('10,000 numbers in an array are 10,000 drops and one record in quarantine', () => {
  const message = Buffer.from(`{"data":[${'17,'.repeat(9999)}17]}`)
  const outcome = readMessage(formats.readings, message)
  expect(outcome.dropped).toEqual({ unreadable: 10_000 })
  expect(outcome.quarantined).toHaveLength(1)
})

test('a record nested a million levels deep does not overflow the stack', () => {
  for (const bracket of ['[', '{"a":'])
    expect(readMessage('ndjson', Buffer.from(bracket.repeat(1e6)), { limit: 16 * mebi }).dropped).toEqual({
      unreadable: 1,
    })
})

test('names without end: 20,000 are taken, the others counted', async () => {
  const lines = Array.from({ length: 30_000 }, (_, k) => `{"signal":"S${k}","time":${t},"value":1}\n`)
  const heard = await play('ndjson', cut(Buffer.from(lines.join('')), 65_536))
  expect(heard.readings).toHaveLength(20_000)
  expect(heard.dropped).toEqual({ 'too-many-signals': 10_000 })
  const header = ['date', ...Array.from({ length: 30_000 }, (_, k) => `S${k}`)].join()
  const row = ['2026-01-02', ...new Array(30_000).fill('1')].join()
  const wide = await play(formats.wide, [Buffer.from(`${header}\n${row}\n`)])
  expect(wide.readings).toHaveLength(20_000)
  expect(wide.dropped).toEqual({ 'too-many-signals': 10_000 })
})

test('64 MB of one byte in 64 kB of gzip stay packed until they are wanted', async () => {
  const packed = gzipSync(Buffer.concat([good, Buffer.alloc(64 * mebi, 'x'), Buffer.from('\n'), good]))
  expect(packed.length).toBeLessThan(mebi / 8)
  let most = 0
  const before = held()
  const stdin = cut(packed, 4096)
  const watched = (function* () {
    for (const piece of stdin) {
      most = Math.max(most, held() - before)
      yield piece
    }
  })()
  const heard = await play('ndjson', watched, limit)
  expect(heard.readings).toHaveLength(2)
  expect(heard.dropped).toEqual({ 'too-long': 1 })
  expect(most).toBeLessThan(32 * mebi)
})

test('gzip damaged in the middle gives what came before, and one drop', async () => {
  const line = (k: number) => `{"signal":"A","time":${t + k},"value":${Math.sin(k)}}\n`
  const packed = gzipSync(Buffer.from(Array.from({ length: 100_000 }, (_, k) => line(k)).join('')))
  const damaged = Buffer.from(packed)
  damaged.fill(0xff, packed.length / 2, packed.length / 2 + 64)
  const isRight = ({ time, value }: { time: number; value: number }, k: number) =>
    time === t + k && value === Math.sin(k)
  const cutOff = await play('ndjson', cut(packed.subarray(0, packed.length / 2), 65_536))
  expect(cutOff.dropped).toEqual({ 'bad-compression': 1 })
  expect(cutOff.readings.length).toBeGreaterThan(45_000)
  expect(cutOff.readings.length).toBeLessThan(55_000)
  expect(cutOff.readings.every(isRight)).toBe(true)
  expect(cutOff.quarantined[0]?.detail).toMatch(/end too early/)
  // zlib may take some damaged bytes for good ones before it notices: what it makes of them is text like any.
  const broken = await play('ndjson', cut(damaged, 65_536))
  expect(broken.dropped['bad-compression']).toBe(1)
  expect(broken.quarantined.find(({ reason }) => reason === 'bad-compression')?.detail).toMatch(
    /may be wrong/,
  )
  expect(broken.readings.slice(0, 45_000).every(isRight)).toBe(true)
  expect(broken.readings.length).toBeLessThan(60_000)
})

const times = 200
/** Texts of one line or more that stand for the same in a longer text. */
const lasting = cases.filter(
  ({ format, text, error, limit: own }) =>
    format === 'ndjson' &&
    text !== undefined &&
    error === undefined &&
    own === undefined &&
    text[0] !== '\ufeff',
)

test(`the corpus ${times} times over in one stream is counted ${times} times, in flat memory`, async () => {
  const round = Buffer.concat(lasting.map((each) => Buffer.concat([inputOf(each), Buffer.from('\n')])))
  const wanted = lasting.reduce<DropCounts>((sum, { dropped }) => addDrops(sum, dropped), {})
  const marks: number[] = []
  const pieces = (function* () {
    for (let k = 0; k < times; k++) {
      if (k % 20 === 10) marks.push(held())
      yield round
    }
  })()
  const settings = { stdin: {}, format: 'ndjson', 'max-record-bytes': 1 << 20 } as const
  let dropped: DropCounts = {}
  let kept = 0
  const stdin = Readable.from(pieces, { objectMode: false, highWaterMark: 1 })
  const feed = openFeed('test', settings, { now: () => t, log: () => {}, stdin })
  await new Promise<void>((resolve, reject) => {
    feed.events.subscribe({
      next: (event) => {
        if (event.type !== 'batch') return
        dropped = addDrops(dropped, event.batch.dropped)
        kept += event.quarantined.length
        event.done()
      },
      error: reject,
      complete: resolve,
    })
  })
  for (const [reason, count] of Object.entries(wanted))
    expect([reason, dropped[reason as keyof DropCounts]]).toEqual([reason, times * count])
  expect(Object.keys(dropped).sort()).toEqual(Object.keys(wanted).sort())
  expect(kept).toBeGreaterThan(times)
  expect(marks.at(-1)! - marks[1]!).toBeLessThan(mebi)
})

test(`feeds opened and read ${times} times leave nothing behind`, async () => {
  const marks: number[] = []
  for (let k = 0; k < times; k++) {
    for (const format of ['ndjson', 'wide', 'senml'] as const) {
      const own = cases.filter((each) => each.format === format)
      const each = own[k % own.length]!
      await play(formats[format], [inputOf(each)], each.limit)
    }
    for (const each of cases) readMessage(formats[each.format], inputOf(each))
    await new Promise((resolve) => setImmediate(resolve))
    if (k % 10 === 9) marks.push(held())
  }
  // Buffers of the last few feeds may still be here: the least of many marks is without them.
  const early = Math.min(...marks.slice(0, 10))
  expect(Math.min(...marks.slice(10)) - early).toBeLessThan(mebi)
})
