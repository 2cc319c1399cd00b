import type { Admin, Consumer, EachBatchPayload, Kafka } from 'kafkajs'
import type { FeedLog, FeedTimer } from './context.ts'
import { topicFailure } from './kafka-errors.ts'

/**
 * Seconds without any answer, beyond the longest wait, after which the brokers count as away, and after which
 * the client is made anew.
 */
const silenceTold = 4
const silenceEnds = 40

/** Between two fetches the client tells the group that it lives; its session is twice as long as this. */
export const longestWaitMs = 5000

/** Offsets of one partition as the brokers have them. */
export interface PartitionOffsets {
  readonly partition: number
  /** First offset that is still kept. */
  readonly low: bigint
  /** Offset of the next record to be written. */
  readonly high: bigint
  /** What the group committed last; null when nothing. */
  readonly committed: bigint | null
}

export interface SessionOptions {
  readonly topic: string
  readonly group: string
  /** At most `longestWaitMs`. */
  readonly maxWaitMs: number
  readonly maxBytesPerPartition: number
  readonly maxBytes: number
}

/** What a session tells; all are called from the client's own events and must not throw. */
export interface SessionListener {
  /** Member of the group, with these partitions. */
  joined(partitions: readonly number[]): void
  /** A batch was fetched; true when it was taken in. */
  fetched(payload: EachBatchPayload): boolean
  /** Everything before `upTo` was fetched and held no messages. */
  passed(partition: number, upTo: bigint, high: bigint): void
  answered(): void
  silent(detail: string): void
}

/** Offsets of all partitions of the topic. Throws what kafkajs throws. */
export async function offsetsOf(admin: Admin, topic: string, group: string): Promise<PartitionOffsets[]> {
  const [ends, [committed]] = await Promise.all([
    admin.fetchTopicOffsets(topic),
    admin.fetchOffsets({ groupId: group, topics: [topic] }),
  ])
  const stated = new Map(committed?.partitions.map(({ partition, offset }) => [partition, BigInt(offset)]))
  return ends.map(({ partition, low, high }) => {
    const offset = stated.get(partition) ?? -1n
    return { partition, low: BigInt(low), high: BigInt(high), committed: offset >= 0n ? offset : null }
  })
}

/**
 * One life of a Kafka consumer: from joining the group until it breaks, falls silent or is stopped. It never
 * commits by itself and never restarts by itself.
 */
export class KafkaSession {
  readonly #consumer: Consumer
  readonly #options: SessionOptions
  readonly #listener: SessionListener
  #open = true
  #answers = 0
  #end: (detail: string) => void = () => {}

  constructor(kafka: Kafka, options: SessionOptions, listener: SessionListener) {
    this.#options = options
    this.#listener = listener
    this.#consumer = kafka.consumer({
      groupId: options.group,
      sessionTimeout: 10_000,
      rebalanceTimeout: 20_000,
      heartbeatInterval: 2000,
      allowAutoTopicCreation: false,
      minBytes: 1,
      maxWaitTimeInMs: options.maxWaitMs,
      maxBytesPerPartition: options.maxBytesPerPartition,
      maxBytes: options.maxBytes,
      retry: {
        initialRetryTime: 200,
        maxRetryTime: 2000,
        factor: 0.2,
        multiplier: 2,
        retries: 4,
        restartOnFailure: async () => false,
      },
    })
  }

  /** Runs the session; gives why it ended. Throws what kafkajs throws while connecting. */
  async run(stop: AbortSignal, timer: FeedTimer): Promise<string> {
    const ended = new Promise<string>((resolve) => {
      this.#end = resolve
    })
    const aborted = () => this.#end('stopped')
    stop.addEventListener('abort', aborted, { once: true })
    const watching = new AbortController()
    this.#listen()
    try {
      await this.#consumer.connect()
      await this.#consumer.subscribe({ topic: this.#options.topic, fromBeginning: true })
      await this.#consumer.run({
        autoCommit: false,
        eachBatchAutoResolve: false,
        eachBatch: async (payload) => this.#batch(payload),
      })
      void this.#watch(timer, watching.signal)
      if (stop.aborted) aborted()
      return await ended
    } finally {
      this.#open = false
      watching.abort()
      stop.removeEventListener('abort', aborted)
    }
  }

  async close(log: FeedLog): Promise<void> {
    this.#open = false
    await this.#consumer.disconnect().catch((error: unknown) => {
      log('debug', 'the Kafka consumer could not be closed in order', { error: String(error) })
    })
  }

  pause(partition: number): void {
    this.#consumer.pause([{ topic: this.#options.topic, partitions: [partition] }])
  }

  resume(partition: number): void {
    this.#consumer.resume([{ topic: this.#options.topic, partitions: [partition] }])
  }

  seek(partition: number, offset: bigint): void {
    this.#consumer.seek({ topic: this.#options.topic, partition, offset: String(offset) })
  }

  async commit(offsets: readonly { readonly partition: number; readonly offset: string }[]): Promise<void> {
    const { topic } = this.#options
    await this.#consumer.commitOffsets(offsets.map(({ partition, offset }) => ({ topic, partition, offset })))
  }

  #batch(payload: EachBatchPayload): void {
    const { batch, resolveOffset, isStale, isRunning } = payload
    if (!this.#open || !isRunning() || isStale()) return
    const last = batch.messages.at(-1)
    if (last !== undefined && this.#listener.fetched(payload)) resolveOffset(last.offset)
  }

  #listen(): void {
    const { events } = this.#consumer
    const { topic } = this.#options
    this.#consumer.on(events.GROUP_JOIN, ({ payload }) => {
      if (this.#open) this.#listener.joined(payload.memberAssignment[topic] ?? [])
    })
    this.#consumer.on(events.END_BATCH_PROCESS, ({ payload }) => {
      if (!this.#open || payload.lastOffset === null || payload.topic !== topic) return
      this.#listener.passed(payload.partition, BigInt(payload.lastOffset) + 1n, BigInt(payload.highWatermark))
    })
    this.#consumer.on(events.REQUEST, () => {
      this.#answers++
      if (this.#open) this.#listener.answered()
    })
    this.#consumer.on(events.CRASH, ({ payload }) => this.#end(topicFailure(topic, payload.error)))
  }

  /** Counts in ticks of a second, not by the clock: a process that was busy itself is no silent broker. */
  async #watch(timer: FeedTimer, stop: AbortSignal): Promise<void> {
    const wait = Math.ceil(this.#options.maxWaitMs / 1000)
    let before = this.#answers
    let silence = 0
    while (!stop.aborted) {
      await timer.wait(1000, stop)
      silence = this.#answers === before ? silence + 1 : 0
      before = this.#answers
      if (stop.aborted) return
      if (silence === silenceTold + wait) this.#listener.silent(`no answer for ${silence} s`)
      if (silence >= silenceEnds + wait) this.#end(`no answer for ${silence} s`)
    }
  }
}
