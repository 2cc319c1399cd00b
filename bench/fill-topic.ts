import { createReadStream } from 'node:fs'
import { createInterface } from 'node:readline'
import { Kafka, logLevel, Partitioners } from 'kafkajs'

const chunk = 5000

/** Sends the first `count` lines of a recorded NDJSON to a new topic of 4 partitions, keyed by signal; gives its name. */
export async function fillTopic(broker: string, recording: string, count: number): Promise<string> {
  const topic = `bench-${process.pid}`
  const kafka = new Kafka({ brokers: [broker], clientId: 'tautline-bench', logLevel: logLevel.NOTHING })
  const admin = kafka.admin()
  await admin.connect()
  await admin.createTopics({ topics: [{ topic, numPartitions: 4 }], waitForLeaders: true })
  await admin.disconnect()
  const producer = kafka.producer({ createPartitioner: Partitioners.DefaultPartitioner })
  await producer.connect()
  let sent = 0
  let messages: { key: string; value: string }[] = []
  const flush = async (): Promise<void> => {
    await producer.send({ topic, messages })
    messages = []
  }
  for await (const line of createInterface({ input: createReadStream(recording) })) {
    messages.push({ key: line.slice(11, 14), value: line })
    if (messages.length === chunk) await flush()
    if (++sent === count) break
  }
  if (messages.length > 0) await flush()
  await producer.disconnect()
  return topic
}
