import { randomBytes } from 'node:crypto'
import { chmod, writeFile } from 'node:fs/promises'
import { join } from 'node:path'
import { GenericContainer, type StartedTestContainer } from 'testcontainers'
import { freePort, type Outcome, run, runOrThrow, scratchFolder, until } from '../../support/host.ts'
import { Child, ready, removeFolder } from './child.ts'
import { createTopic, isAnswering } from './kafka-client.ts'
import type { KafkaTools } from './provided.ts'

export interface BrokerOptions {
  /** Port on 127.0.0.1; default: a free one. It stays the same over stop and start. */
  readonly port?: number
  /** Further lines of server.properties; they win over those set here. */
  readonly properties?: Readonly<Record<string, string>>
}

const javaOptions = ['-Xmx512m', '-XX:TieredStopAtLevel=1', '-XX:+UseSerialGC']
const logOptions = ['-Dorg.slf4j.simpleLogger.defaultLogLevel=warn']

const javaArgs = (jars: string, mainClass: string, args: readonly string[]): string[] => [
  ...javaOptions,
  ...logOptions,
  '-cp',
  join(jars, '*'),
  mainClass,
  ...args,
]

/** A random cluster id in Kafka's own form: 16 bytes as base64url, not beginning with a hyphen. */
function clusterId(): string {
  for (;;) {
    const id = randomBytes(16).toString('base64url')
    if (!id.startsWith('-')) return id
  }
}

const propertiesText = (properties: Readonly<Record<string, string>>): string =>
  Object.entries(properties)
    .map(([key, value]) => `${key}=${value}\n`)
    .join('')

/** How a broker is run: as a Java process of this machine, or in a container. */
interface Runner {
  start(): Promise<void>
  stop(): Promise<void>
  kill(): Promise<void>
  tool(mainClass: string, args: readonly string[], input?: string): Promise<Outcome>
  lastWords(): string
}

/**
 * A real Kafka broker of a test's own, one node in KRaft mode, on a fixed port of 127.0.0.1. It can be
 * stopped, killed and started again with the same data: `const broker = await KafkaBroker.start(inject('kafkaTools'))`,
 * at the end `await broker.dispose()`.
 */
export class KafkaBroker {
  readonly bootstrap: string
  readonly #folder: string
  readonly #runner: Runner

  private constructor(bootstrap: string, folder: string, runner: Runner) {
    this.bootstrap = bootstrap
    this.#folder = folder
    this.#runner = runner
  }

  static async start(tools: KafkaTools, options: BrokerOptions = {}): Promise<KafkaBroker> {
    if (tools.by === 'none')
      throw new Error(`a broker of one's own cannot be started here:\n${tools.missing}`)
    const port = options.port ?? (await freePort())
    const controllerPort = await freePort()
    const bootstrap = `127.0.0.1:${port}`
    const folder = await scratchFolder('kafka')
    const seenFolder = tools.by === 'java' ? folder : '/tautline'
    const listen = tools.by === 'java' ? '127.0.0.1' : '0.0.0.0'
    const properties = {
      'process.roles': 'broker,controller',
      'node.id': '1',
      'controller.quorum.voters': `1@127.0.0.1:${controllerPort}`,
      listeners: `PLAINTEXT://${listen}:${port},CONTROLLER://127.0.0.1:${controllerPort}`,
      'advertised.listeners': `PLAINTEXT://${bootstrap}`,
      'controller.listener.names': 'CONTROLLER',
      'listener.security.protocol.map': 'PLAINTEXT:PLAINTEXT,CONTROLLER:PLAINTEXT',
      'inter.broker.listener.name': 'PLAINTEXT',
      'log.dirs': `${seenFolder}/data`,
      'offsets.topic.replication.factor': '1',
      'offsets.topic.num.partitions': '1',
      'transaction.state.log.replication.factor': '1',
      'transaction.state.log.min.isr': '1',
      'transaction.state.log.num.partitions': '1',
      'group.initial.rebalance.delay.ms': '0',
      'auto.create.topics.enable': 'false',
      // A broker that was killed is let in again only when its old session has run out.
      'broker.session.timeout.ms': '2000',
      'broker.heartbeat.interval.ms': '500',
      ...options.properties,
    }
    await writeFile(join(folder, 'server.properties'), propertiesText(properties))
    const runner =
      tools.by === 'java'
        ? new JavaRunner(tools.java, tools.jars, folder, bootstrap)
        : new ContainerRunner(tools.image, folder, port)
    const broker = new KafkaBroker(bootstrap, folder, runner)
    try {
      await broker.restart()
    } catch (error) {
      await broker.dispose()
      throw error
    }
    return broker
  }

  /** An orderly end, as on SIGTERM. */
  stop(): Promise<void> {
    return this.#runner.stop()
  }

  /** An end without warning, as on SIGKILL or a loss of power of the process. */
  kill(): Promise<void> {
    return this.#runner.kill()
  }

  /** Starts it again with the same data and port; resolves when clients are answered. */
  restart(): Promise<void> {
    return this.#runner.start()
  }

  createTopic(topic: string, partitions = 1, config: Readonly<Record<string, string>> = {}): Promise<void> {
    return createTopic(this.bootstrap, topic, partitions, config)
  }

  /** Runs one of Kafka's own command-line tools by its main class, such as `org.apache.kafka.tools.consumer.group.ConsumerGroupCommand`. */
  tool(mainClass: string, args: readonly string[], input?: string): Promise<Outcome> {
    return this.#runner.tool(mainClass, args, input)
  }

  /** The last of its log. */
  get output(): string {
    return this.#runner.lastWords()
  }

  /** Ends it and removes its data. */
  async dispose(): Promise<void> {
    await this.#runner.kill()
    await removeFolder(this.#folder)
  }
}

class JavaRunner implements Runner {
  readonly #java: string
  readonly #jars: string
  readonly #folder: string
  readonly #bootstrap: string
  #formatted = false
  #child: Child | null = null

  constructor(java: string, jars: string, folder: string, bootstrap: string) {
    this.#java = java
    this.#jars = jars
    this.#folder = folder
    this.#bootstrap = bootstrap
  }

  async start(): Promise<void> {
    const settings = join(this.#folder, 'server.properties')
    if (!this.#formatted) {
      const format = ['format', '-t', clusterId(), '-c', settings]
      await runOrThrow(this.#java, javaArgs(this.#jars, 'kafka.tools.StorageTool', format))
      this.#formatted = true
    }
    const child = new Child(this.#java, javaArgs(this.#jars, 'kafka.Kafka', [settings]), this.#folder)
    this.#child = child
    await ready(child, 'Kafka', () => isAnswering(this.#bootstrap), 120_000)
  }

  async stop(): Promise<void> {
    await this.#child?.stop()
  }

  async kill(): Promise<void> {
    await this.#child?.kill()
  }

  tool(mainClass: string, args: readonly string[], input?: string): Promise<Outcome> {
    const options = input === undefined ? {} : { input }
    return run(this.#java, javaArgs(this.#jars, mainClass, args), options)
  }

  lastWords(): string {
    return this.#child?.output ?? ''
  }
}

class ContainerRunner implements Runner {
  readonly #image: string
  readonly #folder: string
  readonly #port: number
  readonly #id = clusterId()
  #container: StartedTestContainer | null = null

  constructor(image: string, folder: string, port: number) {
    this.#image = image
    this.#folder = folder
    this.#port = port
  }

  async start(): Promise<void> {
    await chmod(this.#folder, 0o777)
    const format = `format --ignore-formatted -t ${this.#id} -c /tautline/server.properties`
    const steps = [
      `/opt/kafka/bin/kafka-storage.sh ${format}`,
      'exec /opt/kafka/bin/kafka-server-start.sh /tautline/server.properties',
    ]
    this.#container = await new GenericContainer(this.#image)
      .withBindMounts([{ source: this.#folder, target: '/tautline', mode: 'rw' }])
      .withEntrypoint(['sh', '-c', steps.join(' && ')])
      .withExposedPorts({ container: this.#port, host: this.#port })
      .withStartupTimeout(180_000)
      .start()
    await until('Kafka', () => isAnswering(`127.0.0.1:${this.#port}`), { withinMs: 120_000 })
  }

  async stop(): Promise<void> {
    await this.#container?.stop({ timeout: 20_000, remove: true })
    this.#container = null
  }

  async kill(): Promise<void> {
    await this.#container?.stop({ timeout: 0, remove: true })
    this.#container = null
  }

  async tool(mainClass: string, args: readonly string[], input?: string): Promise<Outcome> {
    if (!this.#container) return { code: null, stdout: '', stderr: 'the broker is not running' }
    if (input !== undefined) await writeFile(join(this.#folder, 'input'), input)
    const redirect = input === undefined ? '' : ' < /tautline/input'
    const script = `exec /opt/kafka/bin/kafka-run-class.sh "$@"${redirect}`
    const result = await this.#container.exec(['sh', '-c', script, 'tool', mainClass, ...args])
    return { code: result.exitCode, stdout: result.stdout, stderr: result.stderr }
  }

  lastWords(): string {
    return ''
  }
}
