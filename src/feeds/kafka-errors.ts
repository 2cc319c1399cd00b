import { escapeText } from './escape.ts'

const refusals = new Set([
  'SASL_AUTHENTICATION_FAILED',
  'UNSUPPORTED_SASL_MECHANISM',
  'TOPIC_AUTHORIZATION_FAILED',
  'GROUP_AUTHORIZATION_FAILED',
  'CLUSTER_AUTHORIZATION_FAILED',
])

interface KafkaError {
  readonly name?: string
  readonly type?: string
  readonly message?: string
  readonly cause?: unknown
}

export const messageOf = (error: unknown): string =>
  escapeText(error instanceof Error ? error.message : String(error))

/** The first of an error and its causes of which `holds` is true. */
function causeOf(error: unknown, holds: (cause: KafkaError) => boolean): KafkaError | null {
  let cause = error as KafkaError | null | undefined
  for (let depth = 0; depth < 6 && typeof cause === 'object' && cause !== null; depth++) {
    if (holds(cause)) return cause
    cause = cause.cause as KafkaError | null | undefined
  }
  return null
}

/** What the brokers said when they refused the login or the rights; null for every other error. */
export function loginRefusal(error: unknown): string | null {
  const refusal = causeOf(
    error,
    ({ name, type = '' }) => name === 'KafkaJSSASLAuthenticationError' || refusals.has(type),
  )
  return refusal === null ? null : messageOf(refusal)
}

/** Why a topic cannot be read, in a few plain words. */
export function topicFailure(topic: string, error: unknown): string {
  const unknown = causeOf(error, ({ type }) => type === 'UNKNOWN_TOPIC_OR_PARTITION')
  return unknown === null ? `topic ${topic}: ${messageOf(error)}` : `the brokers know no topic ${topic}`
}
