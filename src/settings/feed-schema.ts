import { z } from 'zod'
import { broker, duration, pointer, text, timeUnit } from './scalars.ts'

const tlsSchema = z
  .union([
    z.boolean(),
    z.strictObject({
      ca: text.optional().meta({ description: 'PEM file of the authority.' }),
      cert: text.optional().meta({ description: 'PEM file of the client certificate.' }),
      key: text.optional().meta({ description: 'PEM file of the client key.' }),
      'server-name': text.optional().meta({ description: 'Name that the server certificate must carry.' }),
    }),
  ])
  .meta({ description: 'Encrypts the connection; true trusts the authorities of the system.' })

const saslSchema = z
  .strictObject({
    mechanism: z
      .enum(['plain', 'scram-sha-256', 'scram-sha-512'])
      .meta({ description: 'How the user proves who it is.' }),
    username: text.meta({ description: 'Name of the user.' }),
    password: text.meta({
      secret: true,
      description: 'A secret: ${NAME} from the environment or from the file named by NAME_FILE.',
      examples: ['${KAFKA_PASSWORD}'],
    }),
  })
  .meta({ description: 'Login at the brokers.' })

export const kafkaConnectionSchema = z.strictObject({
  brokers: z
    .array(broker)
    .min(1)
    .max(100)
    .meta({ description: 'Addresses of some brokers; the others are found through them.' }),
  tls: tlsSchema.optional(),
  sasl: saslSchema.optional(),
  'client-id': text.default('tautline').meta({ description: 'Name shown in the logs of the brokers.' }),
})

const unit = timeUnit
  .default('rfc3339')
  .meta({ description: 'How times are written: RFC 3339, or a number since 1970 UTC in this unit.' })

const pointersSchema = z
  .strictObject({
    signal: pointer.meta({ description: 'Pointer to the name of the signal.', examples: ['/sym'] }),
    time: pointer.meta({ description: 'Pointer to the event time.', examples: ['/ts'] }),
    value: pointer.meta({ description: 'Pointer to the value.', examples: ['/px'] }),
    unit,
    readings: pointer.optional().meta({
      description: 'Pointer to an array of readings inside one message; "" where the message is the array.',
    }),
  })
  .meta({ description: 'JSON of any shape, by RFC 6901 pointers.' })

export const formatSchema = z
  .union([
    z
      .literal('ndjson')
      .meta({ description: 'One object a line with signal, time (RFC 3339 or epoch ms), value.' }),
    z.literal('senml').meta({ description: 'SenML JSON packs (RFC 8428).' }),
    z.strictObject({
      csv: z.literal('wide').meta({ description: 'One column a signal.' }),
      time: text.meta({ description: 'Name of the time column; every other column is a signal.' }),
      unit,
    }),
    z.strictObject({
      csv: z.literal('long').meta({ description: 'One reading a line.' }),
      time: text.meta({ description: 'Name of the time column.' }),
      signal: text.meta({ description: 'Name of the column of signal names.' }),
      value: text.meta({ description: 'Name of the column of values.' }),
      unit,
    }),
    pointersSchema,
  ])
  .meta({
    title: 'Format',
    description: 'How a record is written: ndjson, senml, csv wide or long, or JSON by pointers.',
  })

const feedShared = {
  format: formatSchema.default('ndjson'),
  'max-record-bytes': z
    .number()
    .int()
    .min(256)
    .max(64 * 1024 * 1024)
    .default(1024 * 1024)
    .meta({ description: 'A longer record is counted, put in quarantine and skipped.' }),
}

export const feedSchema = z
  .union([
    z.strictObject({
      kafka: kafkaConnectionSchema
        .extend({
          topic: text.meta({ description: 'Topic with the readings.' }),
          group: text.meta({ description: 'Consumer group; one of its own for every monitor.' }),
          from: z
            .enum(['earliest', 'latest'])
            .default('latest')
            .meta({ description: 'Where reading begins when nothing was read before.' }),
          'max-wait': duration
            .prefault('250ms')
            .meta({ description: 'Longest time for which a broker holds back an answer.' }),
        })
        .meta({ description: 'A Kafka topic.' }),
      ...feedShared,
    }),
    z.strictObject({
      file: z
        .strictObject({
          path: text.meta({ description: 'The file, plain or gzip.', examples: ['closes.csv.gz'] }),
          pace: z
            .number()
            .positive()
            .optional()
            .meta({ description: 'Event time over real time. Default: as fast as it can.' }),
        })
        .meta({ description: 'A recorded file.' }),
      ...feedShared,
    }),
    z.strictObject({ stdin: z.strictObject({}).meta({ description: 'Standard input.' }), ...feedShared }),
  ])
  .meta({ title: 'Feed', description: 'A way in for readings.' })
