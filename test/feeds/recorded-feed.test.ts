import { mkdir, rm, writeFile } from 'node:fs/promises'
import { join } from 'node:path'
import { PassThrough, Readable } from 'node:stream'
import { gunzipSync, gzipSync } from 'node:zlib'
import { afterAll, beforeAll, expect, test } from 'vitest'
import type { FeedContext } from '../../src/feeds/context.ts'
import { openFeed } from '../../src/feeds/open-feed.ts'
import type { FormatSettings } from '../../src/settings/schema.ts'
import { scratchFolder, until } from '../support/host.ts'
import { Collected } from './support/collected.ts'
import { FakeTimer, settled } from './support/fake-timer.ts'

const t = 1_700_000_000_000
const line = (i: number) => `{"signal":"S${i % 7}","time":${t + 1000 * i},"value":${i}}\n`
const lines = (from: number, to: number) =>
  Array.from({ length: to - from }, (_, i) => line(from + i)).join('')
const numbers = (from: number, to: number) => Array.from({ length: to - from }, (_, i) => from + i)
const wide: FormatSettings = { csv: 'wide', time: 'date', unit: 'ms' }
const table = (rows: number) =>
  ['date,A,B', ...numbers(0, rows).map((i) => `${t + 1000 * i},${i},${-i}`), ''].join('\n')

let folder = ''
let files = 0
const log: string[] = []
beforeAll(async () => {
  folder = await scratchFolder('feeds')
})
afterAll(() => rm(folder, { recursive: true }))

async function fileOf(content: string | Buffer, name = `f${files++}`): Promise<string> {
  const path = join(folder, name)
  await writeFile(path, content)
  return path
}

const context = (more: Partial<FeedContext> = {}): FeedContext => ({
  now: () => 42,
  log: (level, message) => log.push(`${level} ${message}`),
  ...more,
})

const feedOf = (
  path: string,
  {
    format = 'ndjson',
    pace,
    limit = 1 << 20,
  }: { format?: FormatSettings; pace?: number; limit?: number } = {},
  more: Partial<FeedContext> = {},
) => {
  const file = pace === undefined ? { path } : { path, pace }
  return openFeed('closes', { file, format, 'max-record-bytes': limit }, context(more))
}

const stdinFeed = (stdin: Readable, format: FormatSettings = 'ndjson') =>
  openFeed('piped', { stdin: {}, format, 'max-record-bytes': 1000 }, context({ stdin }))

const values = (got: Collected) => got.readings.map(({ value }) => value)

async function readAll(...args: Parameters<typeof feedOf>): Promise<Collected> {
  const got = new Collected(feedOf(...args))
  await got.ended
  return got
}

test('a file is read from beginning to end in batches, one in flight', async () => {
  const path = await fileOf(lines(0, 50_000))
  let flying = 0
  const got = new Collected(feedOf(path), async () => {
    expect(++flying).toBe(1)
    await new Promise((resolve) => setTimeout(resolve, 1))
    flying--
  })
  await got.ended
  expect(values(got)).toEqual(numbers(0, 50_000))
  expect(got.events.filter((type) => type !== 'batch')).toEqual([
    'connected',
    'assigned',
    'caught-up',
    'ended',
  ])
  expect(got.assigned).toEqual([path])
  expect(got.sizes.length).toBeGreaterThan(5)
  expect(Math.max(...got.sizes)).toBeLessThanOrEqual(16_384)
  expect(got.behind).toBe(0)
  expect(got.completed).toBe(true)
})

test('gzip is known by its first bytes, not by the name of the file', async () => {
  const text = lines(0, 3000)
  for (const [content, name] of [
    [gzipSync(text), 'right.ndjson.gz'],
    [gzipSync(text), 'hidden.ndjson'],
    [text, 'plain.ndjson.gz'],
    [Buffer.concat([gzipSync(lines(0, 1000)), gzipSync(lines(1000, 3000))]), 'two-members.gz'],
    [Buffer.concat([gzipSync(text), Buffer.alloc(100_000)]), 'padded.gz'],
  ] as const) {
    const got = await readAll(await fileOf(content, name))
    expect(values(got), name).toEqual(numbers(0, 3000))
    expect(got.dropped, name).toEqual({})
  }
})

test('a gzip file that was cut off gives all its whole lines, and one count', async () => {
  const packed = gzipSync(lines(0, 3000))
  for (const length of [packed.length - 1, packed.length - 9, packed.length >> 1, 300, 20, 3]) {
    const cut = packed.subarray(0, length)
    const got = await readAll(await fileOf(cut))
    const readable = gunzipSync(cut, { finishFlush: 2 }).toString()
    const whole = readable.slice(0, readable.lastIndexOf('\n') + 1)
    expect(values(got)).toEqual(numbers(0, whole.split('\n').length - 1))
    expect(got.dropped).toEqual({ 'bad-compression': 1 })
    expect(got.quarantined[0]).toMatchObject({ reason: 'bad-compression', source: expect.any(String) })
    expect(got.completed).toBe(true)
  }
})

test('a gzip file that is damaged gives what stands before the damage', async () => {
  const packed = gzipSync(lines(0, 20_000))
  const damaged = Buffer.from(packed)
  damaged.fill(0x55, packed.length >> 1, (packed.length >> 1) + 40)
  const got = await readAll(await fileOf(damaged))
  expect(got.dropped['bad-compression']).toBe(1)
  expect(got.readings.length).toBeGreaterThan(7000)
  expect(values(got).slice(0, 7000)).toEqual(numbers(0, 7000))
  for (const rubbish of [Buffer.from([0x1f, 0x8b]), Buffer.from('1f8b08ffffffff', 'hex')])
    expect((await readAll(await fileOf(rubbish))).dropped).toEqual({ 'bad-compression': 1 })
})

test('the last line of a cut gzip file is not taken for a whole one', async () => {
  const packed = gzipSync(`date,A\n${t},1\n${t + 1},123456`, { level: 0 })
  const got = await readAll(await fileOf(packed.subarray(0, packed.length - 11)), { format: wide })
  expect(values(got)).toEqual([1])
})

test.for([
  ['plain NDJSON', 'ndjson', (n: number) => lines(0, n)],
  ['gzip NDJSON', 'ndjson', (n: number) => gzipSync(lines(0, n))],
  ['plain CSV', wide, (n: number) => table(n / 2)],
  ['gzip CSV', wide, (n: number) => gzipSync(table(n / 2))],
] as const)('a run goes on where the last one stopped: %s', async ([, format, content]) => {
  const path = await fileOf(content(40_000))
  const whole = await readAll(path, { format })
  expect(whole.readings).toHaveLength(40_000)
  let batches = 0
  const first: Collected = new Collected(feedOf(path, { format }), () => {
    if (++batches === 2) first.stop()
  })
  await until('two batches', async () => first.sizes.length === 2)
  const resumeAt = JSON.parse(JSON.stringify({ other: '7', ...first.position }))
  const rest = await readAll(path, { format }, { resumeAt })
  expect([...first.readings, ...rest.readings]).toEqual(whole.readings)
  expect(first.readings.length).toBeLessThan(40_000)
})

test('lines are counted on after a restart, and at the end nothing is left', async () => {
  const path = await fileOf(`${lines(0, 10)}broken\n`)
  const all = await readAll(path)
  expect(all.quarantined.map(({ position }) => position)).toEqual(['11'])
  const offset = Buffer.byteLength(lines(0, 4))
  const rest = await readAll(path, {}, { resumeAt: { [path]: `${offset}:5` } })
  expect(values(rest)).toEqual(numbers(4, 10))
  expect(rest.quarantined.map(({ position }) => position)).toEqual(['11'])
  const again = await readAll(path, {}, { resumeAt: all.position })
  expect([again.readings, again.dropped, again.completed]).toEqual([[], {}, true])
})

test('a file that became shorter is read from its beginning, and this is said', async () => {
  for (const content of [lines(0, 5), gzipSync(lines(0, 5))]) {
    const path = await fileOf(content)
    log.length = 0
    const got = await readAll(path, {}, { resumeAt: { [path]: '100000:900' } })
    expect(values(got)).toEqual(numbers(0, 5))
    expect(log.filter((entry) => entry.startsWith('warn'))).toHaveLength(1)
  }
  const path = await fileOf(lines(0, 5))
  expect(values(await readAll(path, {}, { resumeAt: { [path]: 'rubbish' } }))).toEqual(numbers(0, 5))
})

test('an empty file ends at once', async () => {
  const got = await readAll(await fileOf(''))
  expect(got.events).toEqual(['connected', 'assigned', 'caught-up', 'ended'])
  expect((await readAll(await fileOf(gzipSync('')))).events).toEqual(got.events)
})

test('a missing file, a folder and a header that does not fit end the feed with their codes', async () => {
  const sub = join(folder, 'sub')
  await mkdir(sub)
  expect((await readAll(join(folder, 'none'))).error).toMatchObject({ code: 'feed-file' })
  expect((await readAll(sub)).error).toMatchObject({ code: 'feed-file' })
  const csv = await fileOf('day,A\n1,2\n')
  expect((await readAll(csv, { format: wide })).error).toMatchObject({ code: 'feed-columns' })
  const utf16 = await fileOf(Buffer.from(`\ufeff${line(1)}`, 'utf16le'))
  expect((await readAll(utf16)).error).toMatchObject({ code: 'feed-encoding' })
})

test('check reads the first record, and says in plain words what is wrong', async () => {
  const check = async (...args: Parameters<typeof feedOf>) => feedOf(...args).check()
  expect(await check(await fileOf(gzipSync(lines(3, 9))))).toEqual({
    ok: true,
    detail: 'gzip; first reading: S3 at 2023-11-14T22:13:23.000Z, 3',
  })
  expect(await check(await fileOf(table(3)), { format: wide })).toMatchObject({ ok: true })
  expect(await check(await fileOf(''))).toEqual({ ok: false, detail: 'plain, holds no reading' })
  expect(await check(await fileOf('broken\n'))).toEqual({
    ok: false,
    detail: 'line 1 (plain): not JSON: broken',
  })
  const missing = await check(join(folder, 'none'))
  expect(missing.ok).toBe(false)
  expect(missing.detail).toMatch(/cannot be opened or read.*Make sure/)
  expect((await check(await fileOf('day,A\n'), { format: wide })).detail).toContain(
    'There is no column "date"',
  )
})

test('a paced file is played by its event times', async () => {
  const timer = new FakeTimer()
  const path = await fileOf(`${lines(0, 3)}{"signal":"S0","time":${t + 60_000},"value":60}\n`)
  const got = new Collected(feedOf(path, { pace: 10 }, { timer }))
  await until('the first', async () => got.readings.length === 1)
  await timer.pass(99)
  expect(values(got)).toEqual([0])
  await timer.pass(101)
  expect(values(got)).toEqual([0, 1, 2])
  await timer.pass(5799)
  expect(values(got)).toEqual([0, 1, 2])
  await timer.pass(1)
  expect(values(got)).toEqual([0, 1, 2, 60])
  await got.ended
})

test('a held file waits, a stopped one gives no more', async () => {
  const path = await fileOf(lines(0, 50_000))
  const feed = feedOf(path)
  const got: Collected = new Collected(feed, () => feed.hold(path, true))
  await until('the first batch', async () => got.sizes.length === 1)
  await new Promise((resolve) => setTimeout(resolve, 50))
  expect(got.sizes).toHaveLength(1)
  feed.hold(path, false)
  await until('the second batch', async () => got.sizes.length === 2)
  got.stop()
  feed.hold(path, false)
  await new Promise((resolve) => setTimeout(resolve, 50))
  expect(got.sizes).toHaveLength(2)
  expect(got.completed).toBe(false)
})

test('standard input is read as it comes, plain or gzip, and says when it has nothing waiting', async () => {
  const stdin = new PassThrough()
  const got = new Collected(stdinFeed(stdin))
  stdin.write(lines(0, 3))
  await until('three', async () => got.readings.length === 3)
  await settled()
  expect(got.caughtUp).toEqual(['stdin'])
  const next = line(3)
  stdin.write(next.slice(0, 10))
  await settled()
  stdin.end(`${next.slice(10)}${'x'.repeat(5000)}\n${line(4).trim()}`)
  await got.ended
  expect(values(got)).toEqual(numbers(0, 5))
  expect(got.dropped).toEqual({ 'too-long': 1 })
  expect(got.quarantined[0]).toMatchObject({ source: 'stdin', position: '5', feed: 'piped', at: 42 })
  const packed = new Collected(stdinFeed(Readable.from([gzipSync(lines(0, 100))])))
  await packed.ended
  expect(values(packed)).toEqual(numbers(0, 100))
})

test('standard input is not read faster than it is used, and is let go when the feed is stopped', async () => {
  let asked = 0
  const stdin = new Readable({
    highWaterMark: 1000,
    read() {
      asked++
      this.push(lines(0, 100))
    },
  })
  const got = new Collected(stdinFeed(stdin), () => new Promise<void>(() => {}))
  await new Promise((resolve) => setTimeout(resolve, 50))
  expect(asked).toBeLessThan(10)
  got.stop()
  await until('let go', async () => stdin.destroyed)
})

test('a stream that breaks off is an error with a code', async () => {
  const stdin = new PassThrough()
  const got = new Collected(stdinFeed(stdin))
  stdin.write(line(0))
  await until('one', async () => got.readings.length === 1)
  stdin.destroy(new Error('gone'))
  await got.ended
  expect(got.error).toMatchObject({ code: 'feed-file', detail: expect.stringContaining('gone') })
})
