import { z } from 'zod'
import { duration, falsePages } from './scalars.ts'

/**
 * The settings, in the words of the YAML file. This schema is the one source: the typed object, the
 * published JSON Schema (schema/settings.schema.json) and the error messages come from it.
 * Durations become milliseconds.
 */

const text = z.string().min(1).max(1000)
const count = z.number().int().min(1).max(1_000_000)

export const sessionsSchema = z.strictObject({
  zone: text.meta({ description: 'IANA time zone, such as Europe/Oslo.' }),
  open: z.string().regex(/^([01]\d|2[0-3]):[0-5]\d$/, 'a time of day such as "09:00"'),
  close: z.string().regex(/^([01]\d|2[0-3]):[0-5]\d$/, 'a time of day such as "16:20"'),
  days: text.default('mon-fri').meta({ description: 'Days of the week: mon-fri, or mon,wed,fri.' }),
  holidays: z.array(z.iso.date()).max(10_000).default([]),
})

export const clockSchema = z.strictObject({
  step: z
    .union([z.literal('row'), duration])
    .meta({ description: 'Length of a frame, or `row`: every distinct time stamp is a frame.' }),
  lateness: duration.default(0),
  'stale-after': duration.optional().meta({
    description: 'A value older than this is missing. Default: 12 steps; with `step: row` one row.',
  }),
  'idle-after': duration.default(30_000).meta({
    description: 'A source that is read up to its end and silent so long no longer holds the clock.',
  }),
  ahead: duration
    .default(86_400_000)
    .meta({ description: 'Readings further than this ahead of the present are dropped.' }),
  sessions: sessionsSchema.optional(),
})

export const signalsSchema = z.union([
  z.array(text).min(2).max(5000),
  z.strictObject({
    pattern: text.meta({ description: 'Glob: * any run of characters, ? one character.' }),
    limit: count.default(2000),
  }),
  z.strictObject({ file: text.meta({ description: 'File with one signal name a line.' }) }),
])

export const windowSchema = z.union([
  z.strictObject({ frames: z.number().int().min(8).max(1_000_000) }),
  z.strictObject({ 'half-life': z.number().min(4).max(1_000_000) }),
])

export const referenceSchema = z.union([
  z.strictObject({ frames: z.number().int().min(16).max(1_000_000) }),
  z.strictObject({
    from: text.meta({ description: 'File with a reference, as `tautline explain --reference` writes it.' }),
  }),
  z.strictObject({
    since: z.union([z.iso.date(), z.iso.datetime({ offset: true })]),
    frames: z.number().int().min(16).default(600),
  }),
  z.strictObject({ lagged: z.number().int().min(1).max(1_000_000) }),
])

export const plannedSchema = z.strictObject({
  from: z.iso.datetime({ offset: true }),
  to: z.iso.datetime({ offset: true }),
  note: text.optional(),
})

export const ensembleSchema = z.strictObject({
  title: text.optional(),
  feeds: z.array(text).min(1).optional().meta({ description: 'Feeds it draws from. Default: all.' }),
  signals: signalsSchema,
  clock: clockSchema,
  increment: z.enum(['log-return', 'difference', 'level']).default('log-return'),
  memory: z.enum(['none', 'prewhiten', 'effective-sample']).default('none'),
  window: windowSchema,
  reference: referenceSchema.default({ frames: 600 }),
  scale: z.enum(['correlation', 'covariance']).default('correlation'),
  'common-volatility': z.enum(['remove', 'keep']).default('remove'),
  truncate: z
    .union([z.literal('off'), z.strictObject({ at: z.number().min(1).max(100) })])
    .default({ at: 5 }),
  level: z
    .number()
    .min(0.0001)
    .max(0.2)
    .default(0.01)
    .meta({ description: 'Chance that the largest noise eigenvalue of a frame counts as an escape.' }),
  limits: z
    .union([
      z.strictObject({ 'false-pages': falsePages }),
      z.strictObject({
        explicit: z.record(z.string(), z.number()),
      }),
    ])
    .prefault({ 'false-pages': '1 per 90d' }),
  'stuck-after': duration.optional().meta({
    description:
      'A signal whose value has not moved for so long is stuck. Default: learnt from its own history.',
  }),
  planned: z.array(plannedSchema).max(10_000).default([]),
  runbook: z.url().optional(),
})

const tlsSchema = z.union([
  z.boolean(),
  z.strictObject({
    ca: text.optional().meta({ description: 'PEM file of the authority.' }),
    cert: text.optional(),
    key: text.optional(),
    'server-name': text.optional(),
  }),
])

const saslSchema = z.strictObject({
  mechanism: z.enum(['plain', 'scram-sha-256', 'scram-sha-512']),
  username: text,
  password: text.meta({
    secret: true,
    description: 'A secret: ${NAME} from the environment or from the file named by NAME_FILE.',
  }),
})

export const kafkaConnectionSchema = z.strictObject({
  brokers: z.array(text).min(1).max(100),
  tls: tlsSchema.optional(),
  sasl: saslSchema.optional(),
  'client-id': text.default('tautline'),
})

export const pointersSchema = z.strictObject({
  signal: text.meta({ description: 'RFC 6901 pointer to the signal name, such as /sym.' }),
  time: text,
  value: text,
  unit: z.enum(['rfc3339', 's', 'ms', 'us', 'ns']).default('rfc3339'),
  readings: text.optional().meta({
    description: 'Pointer to an array of readings inside one message; "" where the message is the array.',
  }),
})

export const formatSchema = z.union([
  z
    .literal('ndjson')
    .meta({ description: 'One object a line with signal, time (RFC 3339 or epoch ms), value.' }),
  z.literal('senml').meta({ description: 'SenML JSON packs (RFC 8428).' }),
  z.strictObject({
    csv: z.literal('wide'),
    time: text.meta({ description: 'Name of the time column; every other column is a signal.' }),
    unit: z.enum(['rfc3339', 's', 'ms', 'us', 'ns']).default('rfc3339'),
  }),
  z.strictObject({
    csv: z.literal('long'),
    time: text,
    signal: text,
    value: text,
    unit: z.enum(['rfc3339', 's', 'ms', 'us', 'ns']).default('rfc3339'),
  }),
  pointersSchema,
])

const feedShared = {
  format: formatSchema.default('ndjson'),
  'max-record-bytes': z
    .number()
    .int()
    .min(256)
    .max(64 * 1024 * 1024)
    .default(1024 * 1024),
}

export const feedSchema = z.union([
  z.strictObject({
    kafka: kafkaConnectionSchema.extend({
      topic: text,
      group: text,
      from: z.enum(['earliest', 'latest']).default('latest'),
      'max-wait': duration.default(250),
    }),
    ...feedShared,
  }),
  z.strictObject({
    file: z.strictObject({ path: text, pace: z.number().positive().optional() }),
    ...feedShared,
  }),
  z.strictObject({ stdin: z.strictObject({}), ...feedShared }),
])

const routeShared = {
  'give-up-after': duration.default(3 * 86_400_000),
  timeout: duration.default(10_000),
}

export const routeSchema = z.union([
  z.strictObject({
    alertmanager: z.strictObject({
      urls: z.array(z.url()).min(1).max(10),
      'resend-every': duration.default(60_000),
      username: text.optional(),
      password: text.meta({ secret: true }).optional(),
    }),
    labels: z.record(z.string().regex(/^[a-zA-Z_][a-zA-Z0-9_]*$/), text).default({}),
    ...routeShared,
  }),
  z.strictObject({
    webhook: z.strictObject({ url: z.url(), secret: text.meta({ secret: true }) }),
    ...routeShared,
  }),
  z.strictObject({ kafka: kafkaConnectionSchema.extend({ topic: text }), ...routeShared }),
  z.strictObject({ log: z.strictObject({}), ...routeShared }),
])

export const settingsSchema = z.strictObject({
  ensembles: z.record(
    z.string().regex(/^[a-z][a-z0-9-]{0,62}$/, 'a name of lower-case letters, digits and hyphens'),
    ensembleSchema,
  ),
  feeds: z.record(z.string().regex(/^[a-z][a-z0-9-]{0,62}$/), feedSchema).default({}),
  routes: z.record(z.string().regex(/^[a-z][a-z0-9-]{0,62}$/), routeSchema).default({}),
  heartbeat: z
    .strictObject({ every: duration.default(60_000), routes: z.array(text).optional() })
    .optional()
    .meta({ description: 'A signal of life for the dead-man rule of the receiving side.' }),
  store: z
    .strictObject({
      path: text.default('./state/tautline.db'),
      every: duration.default(5_000),
      quarantine: count.default(1000),
    })
    .prefault({}),
  page: z
    .strictObject({
      listen: z
        .string()
        .regex(/^(\[[0-9a-fA-F:.]+\]|[A-Za-z0-9.-]+):\d{1,5}$/, 'ADDRESS:PORT')
        .default('127.0.0.1:8450'),
      token: text.meta({ secret: true }).optional(),
      url: z
        .url()
        .optional()
        .meta({ description: 'Address under which people reach the page, for links in alerts.' }),
    })
    .prefault({}),
})

export type Settings = z.output<typeof settingsSchema>
export type EnsembleSettings = z.output<typeof ensembleSchema>
export type ClockSettings = z.output<typeof clockSchema>
export type SessionSettings = z.output<typeof sessionsSchema>
export type FeedSettings = z.output<typeof feedSchema>
export type FormatSettings = z.output<typeof formatSchema>
export type RouteSettings = z.output<typeof routeSchema>
export type KafkaConnection = z.output<typeof kafkaConnectionSchema>
