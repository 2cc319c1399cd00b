import { realpathSync } from 'node:fs'
import { setTimeout as sleep } from 'node:timers/promises'
import { pathToFileURL } from 'node:url'
import { parseArgs } from 'node:util'
import { CompressionTypes, Kafka, logLevel, Partitioners } from 'kafkajs'
import { clockFrom, clockHelp, clockOptions, readingsOf } from './demo-options.ts'
import { readingJson } from './recorded.ts'

const help = `Sends an invented feed to a Kafka topic: JSON readings, keyed by signal.

  node dist/demo-feeds/produce.js --brokers 127.0.0.1:9092 --topic ticks --speed 300

  --brokers LIST    host:port, separated by commas
  --topic NAME      made with --partitions partitions when it is not there
  --partitions N    default 4
  --speed X         how many times faster than event time; 0: as fast as it goes (default 1)
  --compress        gzip
${clockHelp}
                    (default of --start: so that the feed ends now, or begins now at speed 1)
`

export interface Production {
  readonly brokers: readonly string[]
  readonly topic: string
  readonly partitions: number
  /** Event time over wall time; 0 for as fast as the broker takes it. */
  readonly speed: number
  readonly compress: boolean
}

/** Sends all chunks in order, one request in flight; gives the number of readings that the broker has taken. */
export async function produce(
  production: Production,
  chunks: ReturnType<typeof readingsOf>,
  stop: AbortSignal = new AbortController().signal,
): Promise<number> {
  const { brokers, topic, partitions, speed, compress } = production
  const kafka = new Kafka({
    brokers: [...brokers],
    clientId: 'tautline-demo-feeds',
    logLevel: logLevel.WARN,
    retry: { retries: 20, maxRetryTime: 5000 },
  })
  const admin = kafka.admin()
  await admin.connect()
  if (!(await admin.listTopics()).includes(topic))
    await admin.createTopics({ waitForLeaders: true, topics: [{ topic, numPartitions: partitions }] })
  await admin.disconnect()

  const producer = kafka.producer({ createPartitioner: Partitioners.DefaultPartitioner })
  await producer.connect()
  let sent = 0
  try {
    const began = performance.now()
    let first = Number.NaN
    for (const chunk of chunks) {
      if (stop.aborted) break
      if (Number.isNaN(first)) first = chunk.until
      const due = speed > 0 ? began + (chunk.until - first) / speed : 0
      const wait = due - performance.now()
      if (wait > 1) await sleep(wait, undefined, { signal: stop }).catch(() => {})
      if (chunk.count === 0) continue
      const messages = Array.from({ length: chunk.count }, (_, i) => ({
        key: chunk.names[chunk.signal[i]!]!,
        value: readingJson(chunk, i),
      }))
      const compression = compress ? CompressionTypes.GZIP : CompressionTypes.None
      await producer.send({ topic, messages, compression, acks: -1 })
      sent += chunk.count
    }
  } finally {
    await producer.disconnect()
  }
  return sent
}

/** What the command line asks for, carried out until the feed ends or SIGINT or SIGTERM comes. */
async function main(args: readonly string[]): Promise<void> {
  const { values } = parseArgs({
    args: [...args],
    options: {
      ...clockOptions,
      brokers: { type: 'string' },
      topic: { type: 'string' },
      partitions: { type: 'string', default: '4' },
      speed: { type: 'string', default: '1' },
      compress: { type: 'boolean', default: false },
    },
  })
  if (values.help) {
    console.log(help)
    return
  }
  if (!values.brokers || !values.topic) throw new Error('--brokers LIST and --topic NAME are needed')
  const speed = Number(values.speed)
  if (!(speed >= 0)) throw new Error(`--speed takes a number of at least 0, not "${values.speed}"`)
  const partitions = Number(values.partitions)
  if (!(Number.isInteger(partitions) && partitions > 0))
    throw new Error(`--partitions takes a whole number of at least 1, not "${values.partitions}"`)
  const clock = clockFrom(values, (lengthMs) => Date.now() - (speed === 1 ? 0 : lengthMs))
  const stop = new AbortController()
  for (const signal of ['SIGINT', 'SIGTERM'] as const) process.once(signal, () => stop.abort())
  const production = {
    brokers: values.brokers.split(','),
    topic: values.topic,
    partitions,
    speed,
    compress: values.compress,
  }
  const sent = await produce(production, readingsOf(values.feed, clock), stop.signal)
  console.error(`${sent} readings sent to ${values.topic}`)
}

if (process.argv[1] && import.meta.url === pathToFileURL(realpathSync(process.argv[1])).href)
  await main(process.argv.slice(2)).catch((error: unknown) => {
    console.error(`${error instanceof Error ? error.message : error}\n\n${help}`)
    process.exitCode = 1
  })
