import { readFileSync } from 'node:fs'
import { cp, readFile, rm, writeFile } from 'node:fs/promises'
import { join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { afterAll, beforeAll, expect, inject, test } from 'vitest'
import { parse, stringify } from 'yaml'
import type { Pulse } from '../../src/alerts/alert.ts'
import { openRoute } from '../../src/alerts/open-route.ts'
import { settingsSchema } from '../../src/settings/schema.ts'
import { findProgram, run, scratchFolder, until } from '../support/host.ts'
import { AlertmanagerProcess } from './support/alertmanager.ts'
import { PrometheusProcess, promtool } from './support/prometheus.ts'
import { Receiver } from './support/receiver.ts'

const config = fileURLToPath(new URL('../../config', import.meta.url))
const rulesFile = join(config, 'prometheus/tautline.rules.yml')

interface Rule {
  readonly alert: string
  expr: string
  readonly labels: Readonly<Record<string, string>>
  readonly annotations: Readonly<Record<string, string>>
}
const readRules = (): { groups: { name: string; interval: string; rules: Rule[] }[] } =>
  parse(readFileSync(rulesFile, 'utf8'))
const alertNames = readRules().groups.flatMap(({ rules }) => rules.map(({ alert }) => alert))

let scratch: string
beforeAll(async () => {
  scratch = await scratchFolder('rules')
  await cp(join(config, 'prometheus'), scratch, { recursive: true })
})
afterAll(async () => {
  await rm(scratch, { recursive: true })
})

const testRules = (folder: string) =>
  promtool(inject('prometheus'), ['test', 'rules', join(folder, 'tautline.rules.test.yml')])

test('the rules pass their unit tests', async () => {
  const { code, stdout, stderr } = await testRules(join(config, 'prometheus'))
  expect(stdout + stderr).toContain('SUCCESS')
  expect(code).toBe(0)
})

test('the unit tests notice of every rule when it never fires', async () => {
  const changed = readRules()
  for (const { rules } of changed.groups) for (const rule of rules) rule.expr = 'vector(1) > 2'
  await writeFile(join(scratch, 'tautline.rules.yml'), stringify(changed))
  const { code, stdout, stderr } = await testRules(scratch)
  expect(code).not.toBe(0)
  for (const name of alertNames) expect(stdout + stderr).toContain(name)
})

test('the unit tests notice a rule that fires on a monitor in good health', async () => {
  const changed = readRules()
  for (const { rules } of changed.groups)
    for (const rule of rules)
      if (rule.alert === 'TautlineSignalsUnwell') rule.expr = rule.expr.replace('> 0.2', '> 0.01')
  await writeFile(join(scratch, 'tautline.rules.yml'), stringify(changed))
  const { code, stdout, stderr } = await testRules(scratch)
  expect(code).not.toBe(0)
  expect(stdout + stderr).toContain('expr: "ALERTS", time: 59m')
})

test('every rule has a severity, a summary, a description and a caution', () => {
  for (const { rules } of readRules().groups)
    for (const { labels, annotations } of rules) {
      expect(['critical', 'warning']).toContain(labels.severity)
      expect(Object.keys(annotations)).toEqual(['summary', 'description', 'caution'])
    }
})

test('promtool passes the configuration with its rules', async () => {
  const { code, stderr } = await promtool(inject('prometheus'), [
    'check',
    'config',
    join(config, 'prometheus/prometheus.yml'),
  ])
  expect(stderr).toBe('')
  expect(code).toBe(0)
})

test('a real Prometheus scrapes the monitor by this configuration and evaluates all rules without error', async () => {
  const monitor = await Receiver.start()
  monitor.reply = () => ({
    status: 200,
    headers: { 'content-type': 'text/plain; version=0.0.4' },
    body: '# HELP tautline_alerts_waiting Deliveries in the outbox.\n# TYPE tautline_alerts_waiting gauge\ntautline_alerts_waiting 0\n',
  })
  const shipped = await readFile(join(config, 'prometheus/prometheus.yml'), 'utf8')
  const rules = readRules()
  for (const group of rules.groups) group.interval = '1s'
  const prometheus = await PrometheusProcess.start(inject('prometheus'), {
    config: shipped.replace('tautline:8450', `127.0.0.1:${monitor.port}`).replaceAll('15s', '1s'),
    files: { 'tautline.rules.yml': stringify(rules) },
  })
  try {
    await until('a scrape', async () => (await prometheus.query('up{job="tautline"} == 1')).length === 1)
    expect(monitor.requests[0]?.path).toBe('/metrics')
    const evaluated = await until('all rules evaluated', async () => {
      const answer = (await (await fetch(`${prometheus.url}/api/v1/rules`)).json()) as {
        data: { groups: { rules: { name: string; health: string; state: string }[] }[] }
      }
      const all = answer.data.groups.flatMap(({ rules }) => rules)
      return all.length === alertNames.length && all.every(({ health }) => health !== 'unknown') && all
    })
    expect(evaluated.filter(({ health }) => health !== 'ok')).toEqual([])
    expect(evaluated.map(({ name }) => name)).toEqual(alertNames)
  } finally {
    await prometheus.dispose()
    await monitor.stop()
  }
})

test('amtool passes the configuration of Alertmanager, where it is installed', async () => {
  const amtool = findProgram('amtool')
  const file = join(config, 'alertmanager/alertmanager.yml')
  if (amtool !== null) {
    const { code, stdout, stderr } = await run(amtool, ['check-config', file])
    expect(stdout + stderr).toContain('SUCCESS')
    expect(code).toBe(0)
  }
  expect(await readFile(file, 'utf8')).toContain('TautlineHeartbeat')
})

test('with this configuration heartbeats reach the dead-man service alone, and trials the people on call', async () => {
  const [deadMan, people] = [await Receiver.start(), await Receiver.start()]
  const shipped = await readFile(join(config, 'alertmanager/alertmanager.yml'), 'utf8')
  const manager = await AlertmanagerProcess.start(inject('alertmanager').program, {
    config: shipped
      .replace('http://dead-man.example:8080', deadMan.url)
      .replace('http://pager.example:8080', people.url)
      .replace('group_wait: 10s', 'group_wait: 0s'),
  })
  try {
    const settings = settingsSchema.parse({
      ensembles: {},
      routes: { 'on-call': { alertmanager: { urls: [manager.url] } } },
    }).routes['on-call']!
    const route = openRoute('on-call', settings, {
      log: () => {},
      kafka: () => {
        throw new Error('no Kafka in this test')
      },
    })
    if (!route.ok) throw route.error
    const never = new AbortController().signal
    const pulse: Pulse = { ensembles: { desk: 'steady' }, now: Date.now() }
    await route.value.send({ type: 'heartbeat', pulse, everyMs: 60_000 }, Date.now(), never)
    await route.value.trial(Date.now(), never)
    const [beat] = await deadMan.waitFor(1)
    const [trial] = await people.waitFor(1)
    const names = (request: { body: string } | undefined): string[] =>
      JSON.parse(request!.body).alerts.map(
        (alert: { labels: Record<string, string> }) => alert.labels.alertname,
      )
    expect(names(beat)).toEqual(['TautlineHeartbeat'])
    expect(names(trial)).toEqual(['TautlineTrial'])
    expect(people.requests.some(({ body }) => body.includes('TautlineHeartbeat'))).toBe(false)
  } finally {
    await manager.dispose()
    await deadMan.stop()
    await people.stop()
  }
})
