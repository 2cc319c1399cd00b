import { Observable } from 'rxjs'
import { TautlineError } from '../errors.ts'
import type { FeedSettings, FormatSettings } from '../settings/schema.ts'
import type { FeedContext } from './context.ts'
import type { Feed, FeedEvent, Position } from './feed.ts'
import { kafkaConfig } from './kafka-config.ts'
import { loginRefusal, topicFailure } from './kafka-errors.ts'
import { kafkaLibrary } from './kafka-library.ts'
import { KafkaRun } from './kafka-run.ts'
import { offsetsOf } from './kafka-session.ts'

/** A Kafka topic with readings. */
export interface KafkaRecording {
  readonly kafka: Extract<FeedSettings, { kafka: unknown }>['kafka']
  readonly format: FormatSettings
  /** Longest message, bytes. */
  readonly limit: number
}

/**
 * A Kafka topic: one source a partition, named `topic/partition`; positions are the offset of the next record.
 * Brokers that are away are an event, and are tried again for ever. Offsets are committed only by `commit`.
 * Raises `kafka-certificate`, and `kafka-login` when the very first connection is refused.
 */
export class KafkaFeed implements Feed {
  readonly name: string
  readonly kind = 'kafka'
  readonly events: Observable<FeedEvent>
  readonly #recording: KafkaRecording
  readonly #context: FeedContext
  #run: KafkaRun | null = null

  constructor(name: string, recording: KafkaRecording, context: FeedContext) {
    this.name = name
    this.#recording = recording
    this.#context = context
    this.events = new Observable((subscriber) => {
      const stop = new AbortController()
      try {
        const run = new KafkaRun(name, recording, context, this.#client(), subscriber, stop.signal)
        this.#run = run
        run.run().catch((error) => subscriber.error(error))
      } catch (error) {
        subscriber.error(error)
      }
      return () => stop.abort()
    })
  }

  hold(source: string, held: boolean): void {
    this.#run?.hold(source, held)
  }

  async commit(position: Position): Promise<void> {
    await this.#run?.commit(position)
  }

  /** Asks the brokers for the topic, its partitions and the offsets of the group. */
  async check(): Promise<{ readonly ok: boolean; readonly detail: string }> {
    const { topic, group } = this.#recording.kafka
    try {
      const admin = this.#client().admin({ retry: { retries: 1 } })
      try {
        await admin.connect()
        const offsets = await offsetsOf(admin, topic, group)
        const waiting = offsets.reduce((sum, { low, high }) => sum + (high - low), 0n)
        const begun = offsets.some(({ committed }) => committed !== null)
        const place = begun ? `group ${group} has read here before` : `group ${group} has not read here yet`
        return {
          ok: true,
          detail: `topic ${topic}: ${offsets.length} partitions with ${waiting} messages; ${place}`,
        }
      } finally {
        await admin.disconnect()
      }
    } catch (error) {
      if (error instanceof TautlineError) return { ok: false, detail: `${error.message} ${error.remedy}` }
      const refusal = loginRefusal(error)
      if (refusal === null) return { ok: false, detail: topicFailure(topic, error) }
      const { message } = new TautlineError('kafka-login', `${refusal}.`)
      return { ok: false, detail: `topic ${topic}: ${message}` }
    }
  }

  #client() {
    return new (kafkaLibrary().Kafka)(kafkaConfig(this.#recording.kafka, this.#context.log))
  }
}
