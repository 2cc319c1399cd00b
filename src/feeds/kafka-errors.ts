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

/** What the brokers said when they refused the login or the rights; null for every other error. */
export function loginRefusal(error: unknown): string | null {
  let cause = error as KafkaError | null | undefined
  for (let depth = 0; depth < 6 && typeof cause === 'object' && cause !== null; depth++) {
    if (cause.name === 'KafkaJSSASLAuthenticationError' || refusals.has(cause.type ?? ''))
      return messageOf(cause)
    cause = cause.cause as KafkaError | null | undefined
  }
  return null
}
