import { readFileSync } from 'node:fs'
import { type ConnectionOptions, createSecureContext } from 'node:tls'
import type { KafkaConfig, logCreator, SASLOptions } from 'kafkajs'
import { TautlineError } from '../errors.ts'
import type { KafkaConnection } from '../settings/schema.ts'
import type { FeedLog } from './context.ts'
import { escapeText } from './escape.ts'

/** kafkajs's numbers for its levels; it is not loaded for them, since most runs need no Kafka. */
const errorLevel = 1
const warnLevel = 2

/**
 * What kafkajs says, as lines of our own log. It is loud about what it mends by itself: its errors are our
 * warnings, its warnings are for debugging.
 */
const bridgedLog =
  (log: FeedLog): logCreator =>
  () =>
  ({ namespace, level, log: { message, error, broker } }) => {
    const fields = {
      part: `kafka ${namespace}`,
      ...(broker === undefined ? {} : { broker: String(broker) }),
      ...(error === undefined ? {} : { error: escapeText(String(error)) }),
    }
    log(level === errorLevel ? 'warn' : 'debug', escapeText(message), fields)
  }

/** Raises `kafka-certificate` when a file cannot be read or is no PEM. */
function tlsOptions(tls: KafkaConnection['tls']): boolean | ConnectionOptions {
  if (tls === undefined || typeof tls === 'boolean') return tls ?? false
  try {
    const read = (path: string | undefined) => (path === undefined ? undefined : readFileSync(path, 'utf8'))
    const [ca, cert, key] = [read(tls.ca), read(tls.cert), read(tls.key)]
    const files = {
      ...(ca === undefined ? {} : { ca: [ca] }),
      ...(cert === undefined ? {} : { cert }),
      ...(key === undefined ? {} : { key }),
    }
    if ((cert === undefined) !== (key === undefined)) throw new Error('tls.cert and tls.key go together')
    createSecureContext(files)
    const name = tls['server-name']
    return { ...files, ...(name === undefined ? {} : { servername: name }) }
  } catch (error) {
    const why = error instanceof Error ? error.message : String(error)
    throw new TautlineError('kafka-certificate', `${why}.`, { cause: error })
  }
}

const saslOptions = ({ mechanism, username, password }: NonNullable<KafkaConnection['sasl']>): SASLOptions =>
  ({ mechanism, username, password }) as SASLOptions

/** The settings in kafkajs's words. Raises `kafka-certificate`. */
export function kafkaConfig(settings: KafkaConnection, log: FeedLog): KafkaConfig {
  return {
    brokers: [...settings.brokers],
    clientId: settings['client-id'],
    ssl: tlsOptions(settings.tls),
    ...(settings.sasl === undefined ? {} : { sasl: saslOptions(settings.sasl) }),
    connectionTimeout: 5000,
    authenticationTimeout: 10_000,
    requestTimeout: 15_000,
    retry: { initialRetryTime: 200, maxRetryTime: 2000, factor: 0.2, multiplier: 2, retries: 4 },
    logLevel: warnLevel,
    logCreator: bridgedLog(log),
  }
}
