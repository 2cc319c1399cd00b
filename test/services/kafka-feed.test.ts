import { readFile, rm, writeFile } from 'node:fs/promises'
import { join } from 'node:path'
import { CompressionTypes } from 'kafkajs'
import { afterEach, expect, inject, test } from 'vitest'
import type { FeedContext } from '../../src/feeds/context.ts'
import { kafkaClient as routeClient } from '../../src/feeds/kafka-client.ts'
import { openFeed } from '../../src/feeds/open-feed.ts'
import type { FormatSettings } from '../../src/settings/schema.ts'
import { Collected } from '../feeds/support/collected.ts'
import { freePort, runOrThrow, scratchFolder, until } from '../support/host.ts'
import { KafkaBroker } from './support/kafka-broker.ts'
import { createTopic, kafkaClient, uniqueName } from './support/kafka-client.ts'

const log: string[] = []
const context = (more: Partial<FeedContext> = {}): FeedContext => ({
  now: () => 1_700_000_000_000,
  log: (level, message, fields) => log.push(`${level} ${message} ${JSON.stringify(fields)}`),
  ...more,
})

interface Options {
  readonly group?: string
  readonly from?: 'earliest' | 'latest'
  readonly format?: FormatSettings
  readonly limit?: number
  readonly maxWait?: number
}

const feedOf = (bootstrap: string, topic: string, options: Options = {}, more: Partial<FeedContext> = {}) => {
  const { group = uniqueName('group'), from = 'earliest', format = 'ndjson' } = options
  const { limit = 1 << 20, maxWait = 100 } = options
  const kafka = { brokers: [bootstrap], topic, group, from, 'max-wait': maxWait, 'client-id': 'test' }
  return openFeed('ticks', { kafka, format, 'max-record-bytes': limit }, context(more))
}

const open: Collected[] = []
const collect = (...args: ConstructorParameters<typeof Collected>): Collected => {
  const collected = new Collected(...args)
  open.push(collected)
  return collected
}
afterEach(() => {
  for (const collected of open.splice(0)) collected.stop()
})

const reading = (i: number) => `{"signal":"S${i % 7}","time":${1_700_000_000_000 + i},"value":${i}}`

/** Sends readings `from` … `to - 1`, number i to partition i modulo `partitions`. */
async function send(
  bootstrap: string,
  topic: string,
  [from, to]: readonly [number, number],
  partitions = 1,
  compression = CompressionTypes.None,
): Promise<void> {
  const producer = kafkaClient(bootstrap).producer()
  await producer.connect()
  for (let first = from; first < to; first += 1000) {
    const count = Math.min(1000, to - first)
    const messages = Array.from({ length: count }, (_, k) => ({
      value: reading(first + k),
      partition: (first + k) % partitions,
    }))
    await producer.send({ topic, messages, compression })
  }
  await producer.disconnect()
}

async function sendValues(topic: string, values: readonly (string | Buffer | null)[]): Promise<void> {
  const producer = kafkaClient(inject('kafka')).producer()
  await producer.connect()
  await producer.send({ topic, messages: values.map((value) => ({ value })) })
  await producer.disconnect()
}

const topicWith = async (partitions: number, config: Record<string, string> = {}): Promise<string> => {
  const topic = uniqueName('ticks')
  await createTopic(inject('kafka'), topic, partitions, config)
  return topic
}

const numbers = (from: number, to: number) => Array.from({ length: to - from }, (_, i) => from + i)
const values = (collected: Collected) => collected.readings.map(({ value }) => value).sort((a, b) => a - b)

test('every reading of a topic of four partitions comes once and in its partition’s order', async () => {
  const topic = await topicWith(4)
  await send(inject('kafka'), topic, [0, 20_000], 4)
  const got = collect(feedOf(inject('kafka'), topic))
  await until('all readings', async () => got.readings.length >= 20_000)
  await until('caught up', async () => got.caughtUp.length >= 4)
  expect(values(got)).toEqual(numbers(0, 20_000))
  const sources = numbers(0, 4).map((partition) => `${topic}/${partition}`)
  expect([...got.assigned].sort()).toEqual(sources)
  for (const [partition, source] of sources.entries()) {
    const own = got.readings.filter((one) => one.source === source).map(({ value }) => value)
    expect(own).toEqual(numbers(0, 5000).map((i) => 4 * i + partition))
  }
  expect(got.position).toEqual(Object.fromEntries(sources.map((source) => [source, '5000'])))
  expect([...got.caughtUp].sort()).toEqual(sources)
  expect(got.events.indexOf('connected')).toBeLessThan(got.events.indexOf('assigned'))
  expect(got.behind).toBe(0)
  expect(got.dropped).toEqual({})
})

test('an empty partition is caught up at once, and later readings come', async () => {
  const topic = await topicWith(2)
  const got = collect(feedOf(inject('kafka'), topic, { from: 'latest' }))
  await until('caught up', async () => got.caughtUp.length === 2)
  await send(inject('kafka'), topic, [0, 10], 2)
  await until('the readings', async () => got.readings.length === 10)
  expect(values(got)).toEqual(numbers(0, 10))
})

test('a quiet topic whose broker may hold its answers back for long does not count as lost', async () => {
  const topic = await topicWith(1)
  const got = collect(feedOf(inject('kafka'), topic, { maxWait: 60_000 }))
  await until('caught up', async () => got.caughtUp.length === 1)
  await new Promise((resolve) => setTimeout(resolve, 7000))
  expect(got.events).toEqual(['connected', 'assigned', 'caught-up'])
  await send(inject('kafka'), topic, [0, 10])
  await until('the readings', async () => got.readings.length === 10)
})

test('"latest" begins with what is sent after the feed was opened', async () => {
  const topic = await topicWith(1)
  await send(inject('kafka'), topic, [0, 100])
  const got = collect(feedOf(inject('kafka'), topic, { from: 'latest' }))
  await until('assigned', async () => got.assigned.length === 1)
  await send(inject('kafka'), topic, [100, 150])
  await until('the readings', async () => got.readings.length >= 50)
  expect(values(got)).toEqual(numbers(100, 150))
})

test.for(['snappy', 'lz4', 'zstd', 'gzip'])(
  'batches that the broker compressed with %s are read',
  async (codec) => {
    const topic = await topicWith(1, { 'compression.type': codec })
    await send(inject('kafka'), topic, [0, 5000])
    const got = collect(feedOf(inject('kafka'), topic))
    await until('all readings', async () => got.readings.length >= 5000)
    expect(values(got)).toEqual(numbers(0, 5000))
    expect(got.dropped).toEqual({})
  },
)

test('batches that the sender compressed with gzip are read', async () => {
  const topic = await topicWith(1)
  await send(inject('kafka'), topic, [0, 3000], 1, CompressionTypes.GZIP)
  const got = collect(feedOf(inject('kafka'), topic))
  await until('all readings', async () => got.readings.length >= 3000)
  expect(values(got)).toEqual(numbers(0, 3000))
})

test('Kafka’s own producer with lz4, snappy and zstd is understood', async () => {
  const topic = await topicWith(1)
  const broker = await KafkaBroker.start(inject('kafkaTools'))
  try {
    await broker.createTopic(topic, 1)
    for (const [k, codec] of ['lz4', 'snappy', 'zstd', 'gzip'].entries()) {
      const lines = numbers(k * 500, k * 500 + 500).map((i) => `${reading(i)}\n`)
      const sent = await broker.tool(
        'org.apache.kafka.tools.ConsoleProducer',
        ['--bootstrap-server', broker.bootstrap, '--topic', topic, '--compression-codec', codec],
        lines.join(''),
      )
      expect(sent.code, sent.stderr).toBe(0)
    }
    const got = collect(feedOf(broker.bootstrap, topic))
    await until('all readings', async () => got.readings.length >= 2000)
    expect(values(got)).toEqual(numbers(0, 2000))
    got.stop()
  } finally {
    await broker.dispose()
  }
})

test('after a restart a feed goes on exactly where its checkpoint says, whatever was committed', async () => {
  const topic = await topicWith(3)
  await send(inject('kafka'), topic, [0, 9000], 3)
  const group = uniqueName('group')
  const first = feedOf(inject('kafka'), topic, { group })
  const before = collect(first)
  await until('some readings', async () => before.readings.length >= 9000)
  await first.commit({ [`${topic}/0`]: '10', [`${topic}/1`]: '3000' })
  before.stop()
  const resumeAt = { [`${topic}/0`]: '2990', [`${topic}/1`]: '5' }
  const after = collect(feedOf(inject('kafka'), topic, { group }, { resumeAt }))
  await until('the rest', async () => after.caughtUp.length === 3)
  const count = (partition: number) =>
    after.readings.filter(({ source }) => source === `${topic}/${partition}`).length
  expect([count(0), count(1), count(2)]).toEqual([10, 2995, 3000])
})

test('nothing is committed by itself; commit makes positions durable in the group', async () => {
  const topic = await topicWith(1)
  await send(inject('kafka'), topic, [0, 1000])
  const group = uniqueName('group')
  const feed = feedOf(inject('kafka'), topic, { group })
  const got = collect(feed)
  await until('all readings', async () => got.readings.length >= 1000)
  const admin = kafkaClient(inject('kafka')).admin()
  await admin.connect()
  const committed = async () =>
    (await admin.fetchOffsets({ groupId: group, topics: [topic] }))[0]!.partitions[0]!.offset
  expect(await committed()).toBe('-1')
  await feed.commit({ [`${topic}/0`]: '700', 'another/0': '5' })
  expect(await committed()).toBe('700')
  got.stop()
  await admin.disconnect()
  const again = collect(feedOf(inject('kafka'), topic, { group }))
  await until('the rest', async () => again.caughtUp.length === 1)
  expect(values(again)).toEqual(numbers(700, 1000))
})

test('one batch of a partition is in flight at a time', async () => {
  const topic = await topicWith(2)
  await send(inject('kafka'), topic, [0, 40_000], 2)
  const flying = new Map<string, number>()
  let most = 0
  const got = collect(feedOf(inject('kafka'), topic), async ({ source }) => {
    flying.set(source, (flying.get(source) ?? 0) + 1)
    most = Math.max(most, flying.get(source)!)
    await new Promise((resolve) => setTimeout(resolve, 20))
    flying.set(source, flying.get(source)! - 1)
  })
  await until('all readings', async () => got.readings.length >= 40_000)
  expect(most).toBe(1)
  expect(values(got)).toEqual(numbers(0, 40_000))
  expect(Math.max(...got.sizes)).toBeLessThanOrEqual(8192)
})

test('a held partition gives nothing until it is released, the others go on', async () => {
  const topic = await topicWith(2)
  const feed = feedOf(inject('kafka'), topic)
  const got = collect(feed)
  await until('assigned', async () => got.assigned.length === 2)
  feed.hold(`${topic}/0`, true)
  await send(inject('kafka'), topic, [0, 100_000], 2)
  await until('the free partition', async () => got.readings.length >= 50_000)
  await new Promise((resolve) => setTimeout(resolve, 500))
  expect(new Set(got.readings.map(({ source }) => source))).toEqual(new Set([`${topic}/1`]))
  feed.hold(`${topic}/0`, false)
  await until('the rest', async () => got.readings.length >= 100_000)
  expect(values(got)).toEqual(numbers(0, 100_000))
})

test('records that retention deleted before they were read are told, and reading goes on behind them', async () => {
  const topic = await topicWith(1)
  const feed = feedOf(inject('kafka'), topic)
  const got = collect(feed)
  await until('assigned', async () => got.assigned.length === 1)
  feed.hold(`${topic}/0`, true)
  await send(inject('kafka'), topic, [0, 200_000])
  const admin = kafkaClient(inject('kafka')).admin()
  await admin.connect()
  await admin.fetchTopicMetadata({ topics: [topic] })
  await admin.fetchTopicOffsets(topic)
  await admin.deleteTopicRecords({ topic, partitions: [{ partition: 0, offset: '195000' }] })
  await admin.disconnect()
  feed.hold(`${topic}/0`, false)
  await until('the end', async () => got.position[`${topic}/0`] === '200000')
  const reached = got.readings.length - 5000
  expect(reached).toBeLessThan(195_000)
  expect(values(got)).toEqual([...numbers(0, reached), ...numbers(195_000, 200_000)])
  const told = log.filter((line) => line.startsWith('warn records were deleted') && line.includes(topic))
  expect(told).toHaveLength(1)
  expect(told[0]).toContain(`"reached":"${reached}","goes-on-at":"195000"`)
})

test('partitions go over to a second member of the group and come back when it leaves', async () => {
  const topic = await topicWith(4)
  const group = uniqueName('group')
  const first = collect(feedOf(inject('kafka'), topic, { group }))
  await until('all partitions', async () => first.assigned.length === 4)
  const second = collect(feedOf(inject('kafka'), topic, { group }))
  await until('shared', async () => second.assigned.length === 2 && first.revoked.length === 2)
  expect(second.assigned).toEqual(expect.arrayContaining(first.revoked))
  await send(inject('kafka'), topic, [0, 8000], 4)
  await until('all readings', async () => first.readings.length + second.readings.length >= 8000)
  second.stop()
  await until('back', async () => first.assigned.length === 6)
  await until('all readings', async () => values(first).length >= 8000)
  // Nothing was committed, so the first member reads what the second had read; nothing comes to it twice.
  expect(values(first)).toEqual(numbers(0, 8000))
})

test('rubbish among the messages is counted, kept with its offset, and stops nothing', async () => {
  const topic = await topicWith(1)
  await sendValues(topic, [
    reading(0),
    '{"signal":"A"',
    null,
    '',
    Buffer.from([0, 1, 2, 255]),
    '{"signal":"A","time":1700000000000,"value":1e400}',
    `{"signal":"A","time":1700000000000,"value":1,"more":"${'x'.repeat(2000)}"}`,
    reading(1),
  ])
  const got = collect(feedOf(inject('kafka'), topic, { limit: 1000 }))
  await until('caught up', async () => got.caughtUp.length === 1)
  expect(values(got)).toEqual([0, 1])
  expect(got.dropped).toEqual({ unreadable: 4, 'bad-value': 1, 'too-long': 1 })
  expect(got.quarantined.map(({ position, reason }) => `${position} ${reason}`)).toEqual([
    '1 unreadable',
    '2 unreadable',
    '3 unreadable',
    '4 unreadable',
    '5 bad-value',
    '6 too-long',
  ])
  expect(got.quarantined.every(({ source }) => source === `${topic}/0`)).toBe(true)
  expect(got.position).toEqual({ [`${topic}/0`]: '8' })
})

test('a message may hold many lines, an array, a SenML pack or a CSV table', async () => {
  const one = async (format: FormatSettings, message: string) => {
    const topic = await topicWith(1)
    await sendValues(topic, [message])
    const got = collect(feedOf(inject('kafka'), topic, { format }))
    await until('caught up', async () => got.caughtUp.length === 1)
    return got.readings.map(({ signal, time, value }) => `${signal} ${time} ${value}`)
  }
  const expected = ['A 1700000000000 1.5', 'B 1700000000000 2.5']
  const pair = ['A', 'B'].map((s, i) => ({ signal: s, time: 1_700_000_000_000, value: i + 1.5 }))
  expect(await one('ndjson', pair.map((r) => JSON.stringify(r)).join('\r\n'))).toEqual(expected)
  const pointers = { signal: '/signal', time: '/time', value: '/value', unit: 'ms' as const }
  expect(await one({ ...pointers, readings: '/all' }, JSON.stringify({ all: pair }, null, 2))).toEqual(
    expected,
  )
  expect(await one('senml', '[{"bt":1.7e9,"n":"A","v":1.5},{"n":"B","v":2.5}]')).toEqual(expected)
  const csv = { csv: 'wide' as const, time: 't', unit: 'ms' as const }
  expect(await one(csv, 't,A,B\n1700000000000,1.5,2.5')).toEqual(expected)
})

test('aborted transactions are left out, and the end of one holds nothing up', async () => {
  const topic = await topicWith(1)
  const producer = kafkaClient(inject('kafka')).producer({
    transactionalId: uniqueName('tx'),
    maxInFlightRequests: 1,
    idempotent: true,
  })
  await producer.connect()
  for (const [i, commit] of [true, false, true, false].entries()) {
    const transaction = await producer.transaction()
    await transaction.send({ topic, messages: [{ value: reading(2 * i) }, { value: reading(2 * i + 1) }] })
    await (commit ? transaction.commit() : transaction.abort())
  }
  await producer.disconnect()
  const got = collect(feedOf(inject('kafka'), topic))
  await until('caught up', async () => got.caughtUp.length === 1)
  expect(values(got)).toEqual([0, 1, 4, 5])
})

test('check names the partitions and what waits, and says when topic or broker are missing', async () => {
  const topic = await topicWith(3)
  await send(inject('kafka'), topic, [0, 12], 3)
  const good = await feedOf(inject('kafka'), topic).check()
  expect(good).toMatchObject({ ok: true, detail: expect.stringContaining('3 partitions with 12 messages') })
  const missing = await feedOf(inject('kafka'), uniqueName('nowhere')).check()
  expect(missing).toMatchObject({
    ok: false,
    detail: expect.stringContaining('the brokers know no topic nowhere-'),
  })
  const away = await feedOf('127.0.0.1:1', topic).check()
  expect(away).toMatchObject({ ok: false, detail: expect.stringMatching(/ECONNREFUSED|Connection/) })
})

test('a topic that does not exist yet is waited for', async () => {
  const topic = uniqueName('later')
  const got = collect(feedOf(inject('kafka'), topic))
  await until('told', async () => got.details.length > 0)
  expect(got.details[0]).toBe(`the brokers know no topic ${topic}`)
  expect(log.filter((line) => line.includes(`the brokers know no topic ${topic}`))).toHaveLength(1)
  await createTopic(inject('kafka'), topic, 1)
  await send(inject('kafka'), topic, [0, 5])
  await until('the readings', async () => got.readings.length === 5)
  expect(got.error).toBeNull()
})

test('a topic that is deleted is told and waited for, and read anew when it is back', async () => {
  const topic = await topicWith(2)
  await send(inject('kafka'), topic, [0, 100], 2)
  const got = collect(feedOf(inject('kafka'), topic))
  await until('the readings', async () => got.readings.length === 100)
  const admin = kafkaClient(inject('kafka')).admin()
  await admin.connect()
  await admin.deleteTopics({ topics: [topic] })
  await admin.disconnect()
  await until('told', async () => got.details.includes(`the brokers know no topic ${topic}`))
  await createTopic(inject('kafka'), topic, 2)
  const isBack = () => got.events.lastIndexOf('connected') > got.events.lastIndexOf('disconnected')
  await until('back', async () => isBack())
  await send(inject('kafka'), topic, [100, 150], 2)
  await until('the readings', async () => got.readings.length === 150)
  expect(values(got)).toEqual(numbers(0, 150))
  expect(got.error).toBeNull()
})

test('the client for routes sends', async () => {
  const topic = await topicWith(1)
  const producer = routeClient({ brokers: [inject('kafka')], 'client-id': 'route' }, () => {}).producer()
  await producer.connect()
  await producer.send({ topic, messages: [{ value: reading(3) }] })
  await producer.disconnect()
  const got = collect(feedOf(inject('kafka'), topic))
  await until('the reading', async () => got.readings.length === 1)
})

test('TLS and SASL: right settings read, wrong ones are told in plain words', async () => {
  const folder = await scratchFolder('tls')
  const pem = (name: string) => join(folder, `${name}.pem`)
  const openssl = async (...args: string[]) => runOrThrow('openssl', args, { cwd: folder })
  const day = ['-days', '2', '-nodes', '-newkey', 'rsa:2048']
  await openssl('req', '-x509', ...day, '-subj', '/CN=Authority', '-keyout', 'ca.key', '-out', pem('ca'))
  await openssl('req', '-x509', ...day, '-subj', '/CN=Stranger', '-keyout', 'other.key', '-out', pem('other'))
  await openssl('req', ...day, '-subj', '/CN=localhost', '-keyout', 'server.key', '-out', 'server.csr')
  await writeFile(join(folder, 'names'), 'subjectAltName=DNS:broker.test,IP:127.0.0.1\n')
  const sign = ['-CA', pem('ca'), '-CAkey', 'ca.key', '-CAcreateserial', '-extfile', 'names', '-days', '2']
  await openssl('x509', '-req', '-in', 'server.csr', ...sign, '-out', pem('server'))
  const [port, controllerPort, securePort] = [await freePort(), await freePort(), await freePort()]
  const oneLine = async (file: string) =>
    (await readFile(join(folder, file), 'utf8')).trim().replaceAll('\n', '\\n')
  const login = 'org.apache.kafka.common.security.plain.PlainLoginModule required user_desk="right";'
  const broker = await KafkaBroker.start(inject('kafkaTools'), {
    port,
    properties: {
      'controller.quorum.voters': `1@127.0.0.1:${controllerPort}`,
      listeners: `PLAINTEXT://127.0.0.1:${port},CONTROLLER://127.0.0.1:${controllerPort},SECURE://127.0.0.1:${securePort}`,
      'advertised.listeners': `PLAINTEXT://127.0.0.1:${port},SECURE://127.0.0.1:${securePort}`,
      'listener.security.protocol.map': 'PLAINTEXT:PLAINTEXT,CONTROLLER:PLAINTEXT,SECURE:SASL_SSL',
      'ssl.keystore.type': 'PEM',
      'ssl.keystore.certificate.chain': await oneLine('server.pem'),
      'ssl.keystore.key': await oneLine('server.key'),
      'sasl.enabled.mechanisms': 'PLAIN',
      'listener.name.secure.plain.sasl.jaas.config': login,
    },
  })
  try {
    const topic = uniqueName('secure')
    await broker.createTopic(topic, 1)
    await send(broker.bootstrap, topic, [0, 100])
    const secureFeed = (ca: string, password: string, name?: string) => {
      const tls = { ca: pem(ca), ...(name === undefined ? {} : { 'server-name': name }) }
      const sasl = { mechanism: 'plain' as const, username: 'desk', password }
      const kafka = {
        brokers: [`127.0.0.1:${securePort}`],
        ...{ topic, group: uniqueName('group'), from: 'earliest' as const, 'max-wait': 100 },
        ...{ 'client-id': 'test', tls, sasl },
      }
      return openFeed('ticks', { kafka, format: 'ndjson', 'max-record-bytes': 1000 }, context())
    }
    const got = collect(secureFeed('ca', 'right', 'broker.test'))
    await until('all readings', async () => got.readings.length >= 100)
    expect(values(got)).toEqual(numbers(0, 100))
    got.stop()

    const refused = collect(secureFeed('ca', 'wrong'))
    await refused.ended
    expect(refused.error).toMatchObject({ code: 'kafka-login' })
    expect((await secureFeed('ca', 'wrong').check()).detail).toContain('refuse the login')
    const stranger = await secureFeed('other', 'right').check()
    expect(stranger).toMatchObject({ ok: false, detail: expect.stringMatching(/certificate/) })
    const unreadable = collect(secureFeed('missing', 'right'))
    await unreadable.ended
    expect(unreadable.error).toMatchObject({ code: 'kafka-certificate' })
    expect(log.join('\n')).not.toMatch(/right|wrong/)
  } finally {
    await broker.dispose()
    await rm(folder, { recursive: true })
  }
})

test('a broker stopped and killed under load: the feed comes back by itself, nothing lost, nothing twice', async () => {
  const broker = await KafkaBroker.start(inject('kafkaTools'))
  const rejections: unknown[] = []
  const note = (reason: unknown) => rejections.push(reason)
  process.on('unhandledRejection', note)
  let sending = true
  try {
    const topic = uniqueName('outage')
    await broker.createTopic(topic, 3)
    const group = uniqueName('group')
    const feed = feedOf(broker.bootstrap, topic, { group })
    const got = collect(feed)
    const committer = (async () => {
      while (sending) {
        await feed.commit(got.position)
        await new Promise((resolve) => setTimeout(resolve, 200))
      }
    })()
    const sender = (async () => {
      for (let i = 0; sending; i += 300) {
        await send(broker.bootstrap, topic, [i, i + 300], 3).catch(() => {})
        await new Promise((resolve) => setTimeout(resolve, 20))
      }
    })()
    await until('readings', async () => got.readings.length > 1000)
    for (const end of ['stop', 'kill'] as const) {
      await broker[end]()
      await until(
        'told',
        async () => got.events.lastIndexOf('disconnected') > got.events.lastIndexOf('connected'),
      )
      const before = got.readings.length
      await new Promise((resolve) => setTimeout(resolve, 3000))
      await broker.restart()
      await until('back', async () => got.readings.length > before + 1000, { withinMs: 90_000 })
      expect(got.events.lastIndexOf('connected')).toBeGreaterThan(got.events.lastIndexOf('disconnected'))
    }
    sending = false
    await Promise.all([sender, committer])
    const admin = kafkaClient(broker.bootstrap).admin()
    await admin.connect()
    const ends = await admin.fetchTopicOffsets(topic)
    const total = ends.reduce((sum, { high }) => sum + Number(high), 0)
    await until('all readings', async () => got.readings.length >= total)
    await new Promise((resolve) => setTimeout(resolve, 500))
    const undisturbed = collect(feedOf(broker.bootstrap, topic))
    await until('all readings again', async () => undisturbed.readings.length >= total)
    for (const source of undisturbed.assigned) {
      const inOrder = ({ readings }: Collected) =>
        readings.filter((one) => one.source === source).map(({ value }) => value)
      expect(inOrder(got)).toEqual(inOrder(undisturbed))
    }
    undisturbed.stop()
    await feed.commit(got.position)
    const [committed] = await admin.fetchOffsets({ groupId: group, topics: [topic] })
    await admin.disconnect()
    const kept = committed!.partitions.map(({ partition, offset }) => [`${topic}/${partition}`, offset])
    expect(Object.fromEntries(kept)).toEqual(got.position)
    expect(got.readings.length).toBe(total)
    expect(got.position).toEqual(
      Object.fromEntries(ends.map(({ partition, high }) => [`${topic}/${partition}`, high])),
    )
    expect(got.assigned).toHaveLength(3)
    expect(got.error).toBeNull()
    expect(rejections).toEqual([])
    got.stop()
  } finally {
    sending = false
    process.off('unhandledRejection', note)
    await broker.dispose()
  }
})
