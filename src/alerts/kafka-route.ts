import type { Kafka, Producer } from 'kafkajs'
import type { RouteSettings } from '../settings/schema.ts'
import { trialAlert } from './alert-book.ts'
import { cloudEvent, cloudEventsContentType } from './cloud-event.ts'
import { type Attempt, type Message, type Route, sent, unsent } from './route.ts'

export type KafkaRouteSettings = Extract<RouteSettings, { kafka: unknown }>

/**
 * A Kafka topic: key the ensemble (`heartbeat` for signs of life), so that one partition holds all events
 * of an ensemble in order; value a CloudEvents 1.0 event in the structured form of the CloudEvents Kafka
 * binding, as its content-type header says. Acknowledged by all in-sync replicas. The topic must exist.
 *
 * `connect` makes the client; it is called at the first message and after each failure.
 */
export function kafkaRoute(
  name: string,
  settings: KafkaRouteSettings,
  source: string,
  connect: (connection: KafkaRouteSettings['kafka']) => Kafka,
): Route {
  const { topic } = settings.kafka
  const { timeout: timeoutMs, 'give-up-after': giveUpAfterMs } = settings
  let producer: Promise<Producer> | null = null

  const connected = (): Promise<Producer> => {
    producer ??= (async () => {
      const made = connect(settings.kafka).producer({
        allowAutoTopicCreation: false,
        maxInFlightRequests: 1,
        retry: { retries: 1 },
      })
      await made.connect()
      return made
    })()
    return producer
  }

  const letGo = async (): Promise<void> => {
    const held = producer
    producer = null
    await held?.then((made) => made.disconnect()).catch(() => {})
  }

  const publish = async (key: string, value: string): Promise<Attempt> => {
    const headers = { 'content-type': cloudEventsContentType }
    const made = await connected()
    await made.send({ topic, acks: -1, timeout: timeoutMs, messages: [{ key, value, headers }] })
    return sent(`topic ${topic} has it`)
  }

  /** The work's result, or a failure when it throws, takes too long or is no longer wanted. */
  const bounded = async (work: () => Promise<Attempt>, signal: AbortSignal): Promise<Attempt> => {
    let cancel = () => {}
    const stopped = new Promise<Attempt>((resolve) => {
      const stop = () => resolve(unsent('the monitor is stopping'))
      const timer = setTimeout(
        () => resolve(unsent(`topic ${topic}: no answer within ${timeoutMs} ms`)),
        timeoutMs,
      )
      signal.addEventListener('abort', stop, { once: true })
      cancel = () => {
        clearTimeout(timer)
        signal.removeEventListener('abort', stop)
      }
    })
    const worked = work().catch((error: unknown) => unsent(`topic ${topic}: ${messageOf(error)}`))
    const attempt = await Promise.race([worked, stopped])
    cancel()
    if (!attempt.ok) void letGo()
    return attempt
  }

  const send = (message: Message, _now: number, signal: AbortSignal): Promise<Attempt> => {
    const key = message.type === 'alert' ? message.alert.ensemble : 'heartbeat'
    return bounded(() => publish(key, JSON.stringify(cloudEvent(message, source))), signal)
  }

  return {
    name,
    kind: 'kafka',
    giveUpAfterMs,
    resendEveryMs: null,
    send,
    resend: async () => null,
    check: (signal) =>
      bounded(async () => {
        const admin = connect(settings.kafka).admin()
        await admin.connect()
        try {
          const { topics } = await admin.fetchTopicMetadata({ topics: [topic] })
          return sent(`topic ${topic} is there, with ${topics[0]?.partitions.length ?? 0} partitions`)
        } finally {
          await admin.disconnect()
        }
      }, signal),
    trial: (now, signal) => send({ type: 'alert', alert: trialAlert(now) }, now, signal),
    close: letGo,
  }
}

const messageOf = (error: unknown): string => (error instanceof Error ? error.message : String(error))
