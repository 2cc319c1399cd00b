import { z } from 'zod'
import type { clockSchema, sessionsSchema } from './ensemble-schema.ts'
import { ensembleSchema } from './ensemble-schema.ts'
import type { formatSchema, kafkaConnectionSchema } from './feed-schema.ts'
import { feedSchema } from './feed-schema.ts'
import { routeSchema } from './route-schema.ts'
import { count, duration, httpUrl, listenAddress, name, text } from './scalars.ts'

/**
 * The settings, in the words of the YAML file. This schema is the one source: the typed object, the
 * published JSON Schema (schema/settings.schema.json), the error messages and the table in README.md come
 * from it. Durations become milliseconds.
 */
export const settingsSchema = z.strictObject({
  ensembles: z.record(name, ensembleSchema).meta({ description: 'What is watched, by name.' }),
  feeds: z.record(name, feedSchema).default({}).meta({ description: 'Where readings come from, by name.' }),
  routes: z.record(name, routeSchema).default({}).meta({ description: 'Where alerts go, by name.' }),
  heartbeat: z
    .strictObject({
      every: duration.prefault('60s').meta({ description: 'Time between two signs of life.' }),
      routes: z
        .array(text)
        .optional()
        .meta({ description: 'Names of the routes that get it. Default: all.' }),
    })
    .optional()
    .meta({ description: 'A sign of life for the dead-man rule of the receiving side.' }),
  store: z
    .strictObject({
      path: text.default('./state/tautline.db').meta({ description: 'The SQLite file.' }),
      every: duration.prefault('5s').meta({ description: 'Time between two checkpoints.' }),
      quarantine: count
        .default(1000)
        .meta({ description: 'So many unreadable records are kept to be looked at.' }),
    })
    .prefault({})
    .meta({ description: 'Checkpoint, outbox and journal.' }),
  page: z
    .strictObject({
      listen: listenAddress
        .default('127.0.0.1:8450')
        .meta({ description: 'Where the page, /metrics and /health are served.' }),
      token: text.meta({ secret: true }).optional().meta({
        secret: true,
        description:
          'A secret, needed when the page listens elsewhere than on loopback: ${NAME} from the environment or from the file named by NAME_FILE.',
      }),
      url: httpUrl
        .optional()
        .meta({ description: 'Address under which people reach the page, for links in alerts.' }),
    })
    .prefault({})
    .meta({ description: 'The live page.' }),
})

export type Settings = z.output<typeof settingsSchema>
export type EnsembleSettings = z.output<typeof ensembleSchema>
export type ClockSettings = z.output<typeof clockSchema>
export type SessionSettings = z.output<typeof sessionsSchema>
export type FeedSettings = z.output<typeof feedSchema>
export type FormatSettings = z.output<typeof formatSchema>
export type RouteSettings = z.output<typeof routeSchema>
export type KafkaConnection = z.output<typeof kafkaConnectionSchema>
