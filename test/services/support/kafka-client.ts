import { randomBytes } from 'node:crypto'
import { type Admin, Kafka, logLevel } from 'kafkajs'

/** A client that is silent and gives up soon; tests that look at retries make their own. */
export const kafkaClient = (bootstrap: string): Kafka =>
  new Kafka({
    brokers: [bootstrap],
    clientId: 'tautline-test',
    logLevel: logLevel.NOTHING,
    connectionTimeout: 2000,
    retry: { initialRetryTime: 50, retries: 8 },
  })

async function withAdmin<T>(bootstrap: string, work: (admin: Admin) => Promise<T>): Promise<T> {
  const admin = kafkaClient(bootstrap).admin()
  await admin.connect()
  try {
    return await work(admin)
  } finally {
    await admin.disconnect()
  }
}

/** True when the broker gives its metadata with a controller. */
export async function isAnswering(bootstrap: string): Promise<boolean> {
  const kafka = new Kafka({
    brokers: [bootstrap],
    logLevel: logLevel.NOTHING,
    connectionTimeout: 1000,
    requestTimeout: 2000,
    retry: { retries: 0 },
  })
  const admin = kafka.admin()
  try {
    await admin.connect()
    const { brokers, controller } = await admin.describeCluster()
    return brokers.length > 0 && controller !== null
  } finally {
    await admin.disconnect()
  }
}

/** Makes a topic and waits until every partition has a leader. */
export const createTopic = (
  bootstrap: string,
  topic: string,
  partitions = 1,
  config: Readonly<Record<string, string>> = {},
): Promise<void> =>
  withAdmin(bootstrap, async (admin) => {
    const configEntries = Object.entries(config).map(([name, value]) => ({ name, value }))
    await admin.createTopics({
      waitForLeaders: true,
      topics: [{ topic, numPartitions: partitions, replicationFactor: 1, configEntries }],
    })
  })

/** A name that no other test and no other run uses. */
export const uniqueName = (stem: string): string => `${stem}-${randomBytes(5).toString('hex')}`
