import { Kafka } from 'kafkajs'
import type { KafkaConnection } from '../settings/schema.ts'
import type { FeedLog } from './context.ts'
import { kafkaConfig } from './kafka-config.ts'

/** A client for sending and for administration. It connects to nothing yet. Raises `kafka-certificate`. */
export const kafkaClient = (settings: KafkaConnection, log: FeedLog): Kafka =>
  new Kafka(kafkaConfig(settings, log))
