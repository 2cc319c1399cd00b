import { execFileSync, spawn } from 'node:child_process'
import { existsSync } from 'node:fs'
import { rename, rm } from 'node:fs/promises'
import { join } from 'node:path'
import { fileURLToPath, pathToFileURL } from 'node:url'
import { expect, inject, test } from 'vitest'
import { runOrThrow, scratchFolder, until } from '../support/host.ts'
import { AlertmanagerProcess, heldAlerts } from './support/alertmanager.ts'
import { openBrowser } from './support/browser.ts'
import { KafkaBroker } from './support/kafka-broker.ts'
import { createTopic, isAnswering, kafkaClient, uniqueName } from './support/kafka-client.ts'
import { findPrograms } from './support/programs.ts'
import { PrometheusProcess, promtool } from './support/prometheus.ts'
import { Receiver } from './support/receiver.ts'

async function send(bootstrap: string, topic: string, values: readonly string[]): Promise<void> {
  const producer = kafkaClient(bootstrap).producer()
  await producer.connect()
  await producer.send({ topic, messages: values.map((value) => ({ value })) })
  await producer.disconnect()
}

async function receive(bootstrap: string, topic: string, count: number): Promise<string[]> {
  const consumer = kafkaClient(bootstrap).consumer({ groupId: uniqueName('reader'), maxWaitTimeInMs: 100 })
  const values: string[] = []
  await consumer.connect()
  await consumer.subscribe({ topic, fromBeginning: true })
  await consumer.run({
    eachMessage: async ({ message }) => {
      values.push(String(message.value))
    },
  })
  await until(`${count} messages`, async () => values.length >= count)
  await consumer.disconnect()
  return values
}

const alert = (name: string) => [{ labels: { alertname: name }, annotations: { summary: 'a trial' } }]

const post = (url: string, body: unknown) =>
  fetch(url, {
    method: 'POST',
    headers: { 'content-type': 'application/json' },
    body: JSON.stringify(body),
  })

test('the shared broker takes messages on four partitions and gives them back', async () => {
  const topic = uniqueName('four')
  await createTopic(inject('kafka'), topic, 4)
  const values = Array.from({ length: 40 }, (_, i) => `reading ${i}`)
  await send(inject('kafka'), topic, values)
  expect((await receive(inject('kafka'), topic, 40)).sort()).toEqual([...values].sort())
})

test('a broker of its own keeps its messages and its port over a crash and an orderly stop', async () => {
  const broker = await KafkaBroker.start(inject('kafkaTools'))
  try {
    await broker.createTopic('kept', 1)
    await send(broker.bootstrap, 'kept', ['before the crash'])
    await broker.kill()
    expect(await isAnswering(broker.bootstrap).catch(() => false)).toBe(false)
    await broker.restart()
    await send(broker.bootstrap, 'kept', ['after the crash'])
    await broker.stop()
    expect(await isAnswering(broker.bootstrap).catch(() => false)).toBe(false)
    await broker.restart()
    expect(await receive(broker.bootstrap, 'kept', 2)).toEqual(['before the crash', 'after the crash'])
    const { stdout, code } = await broker.tool('org.apache.kafka.tools.TopicCommand', [
      '--bootstrap-server',
      broker.bootstrap,
      '--describe',
      '--topic',
      'kept',
    ])
    expect(code).toBe(0)
    expect(stdout).toContain('PartitionCount: 1')
  } finally {
    await broker.dispose()
  }
})

test('the shared Alertmanager holds an alert that it is sent', async () => {
  const { url } = inject('alertmanager')
  const name = uniqueName('Trial')
  expect((await post(`${url}/api/v2/alerts`, alert(name))).status).toBe(200)
  const [held] = await heldAlerts(url, `alertname="${name}"`)
  expect(held?.annotations.summary).toBe('a trial')
})

test('an Alertmanager of its own notifies a receiver, is away while stopped, and comes back on its port', async () => {
  const receiver = await Receiver.start()
  const own = await AlertmanagerProcess.start(inject('alertmanager').program, { webhook: receiver.url })
  try {
    await post(`${own.url}/api/v2/alerts`, alert('First'))
    const [request] = await receiver.waitFor(1)
    expect(JSON.parse(request!.body).alerts[0].labels.alertname).toBe('First')
    await own.stop()
    await expect(fetch(own.url)).rejects.toThrow()
    await own.restart()
    expect((await post(`${own.url}/api/v2/alerts`, alert('Second'))).status).toBe(200)
    await receiver.waitFor(1, ({ body }) => body.includes('Second'))
  } finally {
    await own.dispose()
    await receiver.stop()
  }
})

test('the receiver answers as told, and refuses connections while stopped', async () => {
  const receiver = await Receiver.start()
  receiver.reply = (_, index) => ({ status: index === 0 ? 503 : 204 })
  expect((await post(`${receiver.url}/hook`, { a: 1 })).status).toBe(503)
  expect((await post(`${receiver.url}/hook`, { a: 2 })).status).toBe(204)
  expect(receiver.requests.map(({ path, body }) => [path, body])).toEqual([
    ['/hook', '{"a":1}'],
    ['/hook', '{"a":2}'],
  ])
  await receiver.stop()
  await expect(fetch(receiver.url)).rejects.toThrow()
  await receiver.restart()
  expect((await fetch(receiver.url)).status).toBe(204)
  await receiver.stop()
})

test('Prometheus scrapes a target and answers a query', async () => {
  const receiver = await Receiver.start()
  receiver.reply = () => ({
    status: 200,
    headers: { 'content-type': 'text/plain; version=0.0.4' },
    body: '# HELP trial_ratio A trial.\n# TYPE trial_ratio gauge\ntrial_ratio 0.25\n',
  })
  const prometheus = await PrometheusProcess.start(inject('prometheus'), {
    config: `global: { scrape_interval: 1s }\nscrape_configs: [{ job_name: trial, static_configs: [{ targets: ['127.0.0.1:${receiver.port}'] }] }]\n`,
  })
  try {
    const samples = await until('a sample', async () => {
      const found = await prometheus.query('trial_ratio')
      return found.length > 0 && found
    })
    expect(samples[0]!.value).toBe(0.25)
    expect(samples[0]!.metric.job).toBe('trial')
  } finally {
    await prometheus.dispose()
    await receiver.stop()
  }
})

test('promtool passes a good exposition and refuses one without a help text', async () => {
  const good = '# HELP trial_seconds A trial.\n# TYPE trial_seconds gauge\ntrial_seconds 1\n'
  expect((await promtool(inject('prometheus'), ['check', 'metrics'], good)).code).toBe(0)
  const bad = await promtool(inject('prometheus'), ['check', 'metrics'], 'trial_seconds 1\n')
  expect(bad.code).not.toBe(0)
  expect(bad.stderr).toContain('no help text')
})

test('the browser opens a page and runs its script', async () => {
  const browser = await openBrowser(inject('chromium'))
  try {
    const page = await browser.newPage()
    await page.setContent('<h1>one</h1><script>document.querySelector("h1").textContent += " two"</script>')
    expect(await page.textContent('h1')).toBe('one two')
  } finally {
    await browser.close()
  }
})

test('a program that cannot be had is reported with the ways to install it', async () => {
  const wanted = {
    title: 'Nothing',
    variable: 'TAUTLINE_TEST_NOTHING',
    names: ['tautline-no-such-program'],
    debian: 'tautline-no-such-package',
  }
  const { found, missing } = await findPrograms({ wanted }, false)
  expect(found).toEqual({})
  expect(missing[0]).toBe(
    'Nothing: put `tautline-no-such-program` on the PATH (Debian: apt-get install tautline-no-such-package) or its full path in TAUTLINE_TEST_NOTHING',
  )
})

test('a service whose test process is killed ends too, and its scratch folder goes', async () => {
  const scratch = await scratchFolder('guarded')
  const compiled = await scratchFolder('compiled')
  const source = fileURLToPath(new URL('./support/child.ts', import.meta.url))
  const compiler = fileURLToPath(new URL('../../node_modules/.bin/tsc', import.meta.url))
  const options = ['--ignoreConfig', '--target', 'es2023', '--module', 'nodenext', '--types', 'node']
  await runOrThrow(compiler, [...options, '--skipLibCheck', '--outDir', compiled, source])
  await rename(join(compiled, 'child.js'), join(compiled, 'child.mjs'))
  const script = `
    import { Child } from ${JSON.stringify(pathToFileURL(join(compiled, 'child.mjs')).href)}
    const child = new Child(process.execPath, ['-e', 'setInterval(() => {}, 1000)'], ${JSON.stringify(scratch)})
    console.log(child.pid)
    setInterval(() => {}, 1000)
  `
  const owner = spawn(process.execPath, ['--input-type=module', '-e', script], { stdio: 'pipe' })
  const pid = await new Promise<number>((resolve, reject) => {
    owner.stdout.once('data', (chunk: Buffer) => resolve(Number(chunk)))
    owner.once('exit', () => reject(new Error('the owner ended early')))
  })
  const alive = () => {
    try {
      execFileSync('kill', ['-0', String(pid)], { stdio: 'ignore' })
      return true
    } catch {
      return false
    }
  }
  expect(alive()).toBe(true)
  owner.kill('SIGKILL')
  await until('the end of the service', async () => !alive())
  await until('the removal of its folder', async () => !existsSync(scratch))
  await rm(compiled, { recursive: true })
})
