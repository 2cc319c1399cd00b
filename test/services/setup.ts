import { GenericContainer, getContainerRuntimeClient } from 'testcontainers'
import type { TestProject } from 'vitest/node'
import { AlertmanagerProcess } from './support/alertmanager.ts'
import { KafkaBroker } from './support/kafka-broker.ts'
import { isAnswering } from './support/kafka-client.ts'
import { kafkaJars } from './support/kafka-jars.ts'
import { findPrograms, wantedPrograms } from './support/programs.ts'
import type { KafkaTools } from './support/provided.ts'

/**
 * Starts or finds the real services that the tests of this folder need, once for all of them, and ends them.
 * Each is had the first way that works:
 *
 * - Kafka: `TAUTLINE_TEST_KAFKA` (host:port of a broker that allows topics to be made); a container engine;
 *   Java of version 17 or later with Maven.
 * - Prometheus with promtool, Alertmanager, Chromium: `TAUTLINE_TEST_PROMETHEUS`, `TAUTLINE_TEST_PROMTOOL`,
 *   `TAUTLINE_TEST_ALERTMANAGER`, `TAUTLINE_TEST_CHROMIUM` (full paths); the PATH; for all but Chromium a
 *   container image; the Debian package, which is installed here only as root or where CI=true.
 *
 * Where one cannot be had, the run fails with the list of what to install.
 */
const kafkaImage = 'apache/kafka:4.1.0'

async function engineAnswers(): Promise<boolean> {
  try {
    await getContainerRuntimeClient()
    return true
  } catch {
    return false
  }
}

async function findKafkaTools(engine: boolean): Promise<KafkaTools> {
  const failures: string[] = []
  if (engine)
    try {
      const container = await new GenericContainer(kafkaImage)
        .withEntrypoint(['sleep'])
        .withCommand(['1'])
        .start()
      await container.stop()
      return { by: 'container', image: kafkaImage }
    } catch (error) {
      failures.push(`(${kafkaImage} in a container: ${error})`)
    }
  try {
    return { by: 'java', ...(await kafkaJars()) }
  } catch (error) {
    failures.push(`(jars from Maven Central: ${error instanceof Error ? error.message : error})`)
  }
  const remedy =
    'Kafka: install Java 17 or later and Maven (Debian: apt-get install default-jre-headless maven), or a container engine, or give the address of a broker in TAUTLINE_TEST_KAFKA'
  return { by: 'none', missing: [remedy, ...failures].join('\n    ') }
}

export default async function setup(project: TestProject): Promise<() => Promise<void>> {
  const engine = await engineAnswers()
  const [kafkaTools, programs] = await Promise.all([
    findKafkaTools(engine),
    findPrograms(wantedPrograms, engine),
  ])

  const missing: string[] = [...programs.missing]
  const stated = process.env.TAUTLINE_TEST_KAFKA
  const statedAnswers = stated ? await isAnswering(stated).catch(() => false) : false
  if (stated && !statedAnswers) missing.push(`TAUTLINE_TEST_KAFKA: no broker answers at ${stated}`)
  if (!stated && kafkaTools.by === 'none') missing.push(kafkaTools.missing)
  const { prometheus, promtool, alertmanager, chromium } = programs.found
  if (missing.length > 0 || !prometheus || !promtool || !alertmanager || !chromium)
    throw new Error(
      `The tests need real services that are not here. Install them, or run the others alone with \`npx vitest run --project core\`.\n${missing.map((line) => `  - ${line}`).join('\n')}`,
    )

  const started: { dispose(): Promise<void> }[] = []
  const end = async () => {
    await Promise.all(started.map((service) => service.dispose()))
  }
  try {
    const startKafka = async () => {
      if (stated) return stated
      const broker = await KafkaBroker.start(kafkaTools)
      started.push(broker)
      return broker.bootstrap
    }
    const startAlertmanager = async () => {
      const running = await AlertmanagerProcess.start(alertmanager)
      started.push(running)
      return running.url
    }
    const [kafka, alertmanagerUrl] = await Promise.all([startKafka(), startAlertmanager()])
    project.provide('kafka', kafka)
    project.provide('kafkaTools', kafkaTools)
    project.provide('prometheus', { prometheus, promtool })
    project.provide('alertmanager', { program: alertmanager, url: alertmanagerUrl })
    project.provide('chromium', chromium)
    return end
  } catch (error) {
    await end()
    throw error
  }
}
