import type { Kafka } from 'kafkajs'
import { ok, type Result } from '../errors.ts'
import type { KafkaConnection, RouteSettings } from '../settings/schema.ts'
import { alertmanagerRoute } from './alertmanager-route.ts'
import { kafkaRoute } from './kafka-route.ts'
import { logRoute } from './log-route.ts'
import type { Log, Route } from './route.ts'
import { webhookRoute } from './webhook-route.ts'

export interface RouteContext {
  readonly log: Log
  /** Names this monitor in events: a URI reference, such as the address of its page; default `/tautline`. */
  readonly source?: string
  /** Makes a Kafka client from its settings. */
  readonly kafka: (connection: KafkaConnection) => Kafka
}

/**
 * Makes a route from its settings, in which secrets are resolved already. Nothing is sent or connected yet.
 * Fails with `route-secret` or `route-label`.
 */
export function openRoute(name: string, settings: RouteSettings, context: RouteContext): Result<Route> {
  const source = context.source ?? '/tautline'
  if ('alertmanager' in settings) return alertmanagerRoute(name, settings)
  if ('webhook' in settings) return webhookRoute(name, settings, source)
  if ('kafka' in settings) return ok(kafkaRoute(name, settings, source, context.kafka))
  return ok(logRoute(name, settings, source, context.log))
}
