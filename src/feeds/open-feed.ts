import type { FeedSettings } from '../settings/schema.ts'
import type { FeedContext } from './context.ts'
import type { Feed } from './feed.ts'
import { KafkaFeed } from './kafka-feed.ts'
import { RecordedFeed } from './recorded-feed.ts'

/** The feed that the settings state. Opens nothing: that is for `events` and `check`. */
export function openFeed(name: string, settings: FeedSettings, context: FeedContext): Feed {
  const { format, 'max-record-bytes': limit } = settings
  if ('kafka' in settings) return new KafkaFeed(name, { kafka: settings.kafka, format, limit }, context)
  if ('file' in settings) {
    const { path, pace = null } = settings.file
    return new RecordedFeed(name, { kind: 'file', source: path, format, limit, pace }, context)
  }
  return new RecordedFeed(name, { kind: 'stdin', source: 'stdin', format, limit, pace: null }, context)
}
