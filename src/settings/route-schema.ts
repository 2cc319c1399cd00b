import { z } from 'zod'
import { kafkaConnectionSchema } from './feed-schema.ts'
import { duration, httpUrl, text } from './scalars.ts'

const secretWords = 'A secret: ${NAME} from the environment or from the file named by NAME_FILE.'

const routeShared = {
  'give-up-after': duration
    .prefault('3d')
    .meta({ description: 'An alert that could not be delivered for so long is given up, and that is said.' }),
  timeout: duration.prefault('10s').meta({ description: 'Longest time that one attempt may take.' }),
}

export const routeSchema = z
  .union([
    z.strictObject({
      alertmanager: z
        .strictObject({
          urls: z
            .array(httpUrl)
            .min(1)
            .max(10)
            .meta({ description: 'Addresses of all instances; each is sent every alert.' }),
          'resend-every': duration
            .prefault('60s')
            .meta({ description: 'An alert that goes on is sent again so often.' }),
          username: text.optional().meta({ description: 'User name for HTTP basic authentication.' }),
          password: text.meta({ secret: true, description: secretWords }).optional(),
        })
        .meta({ description: 'Prometheus Alertmanager, API v2.' }),
      labels: z
        .record(z.string().regex(/^[a-zA-Z_][a-zA-Z0-9_]*$/, 'letters, digits and underscores'), text)
        .default({})
        .meta({ description: 'Labels that every alert gets.' }),
      ...routeShared,
    }),
    z.strictObject({
      webhook: z
        .strictObject({
          url: httpUrl.meta({ description: 'Address to which alerts are posted.' }),
          secret: text.meta({ secret: true, description: `Signs the alerts. ${secretWords}` }),
        })
        .meta({ description: 'Signed webhook: Standard Webhooks headers, CloudEvents 1.0 body.' }),
      ...routeShared,
    }),
    z.strictObject({
      kafka: kafkaConnectionSchema
        .extend({ topic: text.meta({ description: 'Topic to which alerts are written.' }) })
        .meta({ description: 'A Kafka topic; brokers, tls, sasl and client-id as under feeds.' }),
      ...routeShared,
    }),
    z.strictObject({
      log: z.strictObject({}).meta({ description: 'The log of the monitor.' }),
      ...routeShared,
    }),
  ])
  .meta({ title: 'Route', description: 'A way out for alerts.' })
