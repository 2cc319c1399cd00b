import { Kafka, logLevel } from 'kafkajs'
import { Webhook } from 'standardwebhooks'
import { afterEach, expect, inject, test } from 'vitest'
import type { Alert, Pulse } from '../../src/alerts/alert.ts'
import { Dispatcher } from '../../src/alerts/dispatcher.ts'
import { Heartbeat } from '../../src/alerts/heartbeat.ts'
import { openRoute } from '../../src/alerts/open-route.ts'
import { postAlerts } from '../../src/alerts/outbox.ts'
import type { Route } from '../../src/alerts/route.ts'
import type { DeliveryReport } from '../../src/alerts/settlement.ts'
import { settingsSchema } from '../../src/settings/schema.ts'
import { openStore } from '../../src/store/open-store.ts'
import { book, shiftEvent } from '../alerts/support/shifts.ts'
import { freePort, until } from '../support/host.ts'
import { AlertmanagerProcess, heldAlerts } from './support/alertmanager.ts'
import { KafkaBroker } from './support/kafka-broker.ts'
import { createTopic, kafkaClient, uniqueName } from './support/kafka-client.ts'
import { Receiver } from './support/receiver.ts'

const never = new AbortController().signal
const secret = `whsec_${Buffer.from('another key of thirty-two bytes!').toString('base64')}`
const closing: (() => Promise<unknown>)[] = []
afterEach(async () => {
  for (const close of closing.splice(0).reverse()) await close()
})

function route(name: string, settings: unknown): Route {
  const parsed = settingsSchema.parse({ ensembles: {}, routes: { [name]: settings } }).routes[name]!
  const opened = openRoute(name, parsed, {
    log: () => {},
    kafka: ({ brokers }) =>
      new Kafka({
        brokers: [...brokers],
        logLevel: logLevel.NOTHING,
        connectionTimeout: 1000,
        retry: { retries: 1, initialRetryTime: 100 },
      }),
  })
  if (!opened.ok) throw opened.error
  closing.push(() => opened.value.close())
  return opened.value
}

const after = (ms: number, callback: () => void) => {
  const timer = setTimeout(callback, ms)
  return () => clearTimeout(timer)
}

/** A monitor's way out, under the real clock, with short waits. */
function wayOut(routes: readonly Route[]) {
  const store = openStore(':memory:')
  const reports: DeliveryReport[] = []
  const alerts = book()
  const dispatcher = new Dispatcher({
    store,
    routes,
    now: Date.now,
    after,
    random: Math.random,
    standing: (now) => alerts.standing(now),
    report: (report) => reports.push(report),
    log: () => {},
    backoff: { firstMs: 100, longestMs: 500 },
    pollMs: 100,
  })
  closing.push(async () => {
    await dispatcher.stop()
    store.close()
  })
  dispatcher.start()
  const post = (versions: readonly Alert[]) => {
    postAlerts(store, versions, routes, Date.now())
    dispatcher.poke()
    return versions
  }
  const raise = (ensemble: string) =>
    post(
      alerts.take(
        shiftEvent(
          { start: Date.now() - 60_000, confirmed: Date.now() - 1000 },
          { ensemble, now: Date.now() },
        ),
      ),
    )[0]!
  const end = (ensemble: string) =>
    post(alerts.take({ type: 'steady', ensemble, shift: 3, time: Date.now(), now: Date.now() }))[0]!
  return { store, reports, raise, end }
}

test('an alert appears in Alertmanager, comes back after it was killed, and ends there', async () => {
  const people = await Receiver.start()
  closing.push(() => people.stop())
  const manager = await AlertmanagerProcess.start(inject('alertmanager').program, { webhook: people.url })
  closing.push(() => manager.dispose())
  const onCall = route('on-call', {
    alertmanager: { urls: [manager.url], 'resend-every': '1s' },
    labels: { team: 'risk' },
  })
  const { store, reports, raise, end } = wayOut([onCall])
  const held = async (ensemble: string) => {
    const [found, ...more] = await heldAlerts(manager.url, `ensemble="${ensemble}"`)
    expect(more).toEqual([])
    return found
  }

  const desk = raise('desk')
  const first = await until('the alert', async () => (await held('desk')) ?? null)
  expect(first.labels).toEqual({
    alertname: 'TautlineShift',
    ensemble: 'desk',
    kind: 'strength',
    shift: '3',
    severity: 'warning',
    team: 'risk',
  })
  expect(first.annotations.summary).toBe(desk.sentence)
  expect(first.annotations.caution).toContain('no safety function')
  expect(Date.parse(first.startsAt)).toBe(desk.shift!.start)
  expect(first.generatorURL).toBe(desk.page)

  await manager.kill()
  raise('plant')
  await until('failed tries', async () => reports.filter(({ outcome }) => outcome === 'failed').length >= 5)
  expect(store.waiting()).toBe(1)
  await manager.restart()
  await until('the alert raised meanwhile', async () => (await held('plant')) ?? null)
  await until('the alert of before, told again', async () => (await held('desk')) ?? null)
  expect(store.waiting()).toBe(0)

  end('desk')
  await until('the end', async () => (await held('desk')) === undefined)
  expect((await held('plant'))?.status.state).toBe('active')
  // People are told of the end too, and only once of each: repetitions are one alert to Alertmanager.
  await people.waitFor(1, ({ body }) => body.includes('"status":"resolved"') && body.includes('"desk"'))
  const told = people.requests
    .flatMap(({ body }) => JSON.parse(body).alerts as { status: string; labels: Record<string, string> }[])
    .filter(({ labels }) => labels.ensemble === 'desk')
    .map(({ status }) => status)
  expect(told.filter((status) => status === 'resolved')).toHaveLength(1)
})

test('an alert stands in Alertmanager no longer than four intervals after the monitor has fallen silent', async () => {
  const { url } = inject('alertmanager')
  const ensemble = uniqueName('silent')
  const onCall = route('on-call', { alertmanager: { urls: [url], 'resend-every': '500ms' } })
  const [alert] = book().take(shiftEvent({}, { ensemble, now: Date.now() }))
  expect(await onCall.send({ type: 'alert', alert: alert! }, Date.now(), never)).toMatchObject({ ok: true })
  expect(await heldAlerts(url, `ensemble="${ensemble}"`)).toHaveLength(1)
  await until('its end', async () => (await heldAlerts(url, `ensemble="${ensemble}"`)).length === 0, {
    withinMs: 10_000,
  })
})

test('trial and heartbeat appear under names of their own; with one instance down the other is told', async () => {
  const { url } = inject('alertmanager')
  const monitor = uniqueName('monitor')
  const onCall = route('on-call', {
    alertmanager: { urls: [url, `http://127.0.0.1:${await freePort()}`] },
    labels: { monitor },
  })
  const attempt = await onCall.trial(Date.now(), never)
  expect(attempt).toMatchObject({ ok: true })
  expect(attempt.detail).toContain('ECONNREFUSED')
  const pulse: Pulse = { ensembles: { desk: 'steady', plant: 'shifted' }, now: Date.now() }
  const heartbeat = new Heartbeat({
    routes: [onCall],
    everyMs: 60_000,
    now: Date.now,
    after,
    pulse: () => pulse,
    report: () => {},
    log: () => {},
  })
  heartbeat.start()
  const both = await until('both', async () => {
    const found = await heldAlerts(url, `monitor="${monitor}"`)
    return found.length === 2 && found
  })
  await heartbeat.stop()
  const named = Object.fromEntries(both.map((alert) => [alert.labels.alertname, alert]))
  expect(named.TautlineTrial!.annotations.summary).toMatch(/^Trial: /)
  expect(named.TautlineHeartbeat!.annotations.description).toBe('Ensembles: desk steady, plant shifted.')
  expect(named.TautlineHeartbeat!.labels.severity).toBe('none')
})

test('a webhook that is away takes all versions in order, with signatures that an independent reader verifies', async () => {
  const hook = await Receiver.start()
  closing.push(() => hook.stop())
  await hook.stop()
  const { store, reports, raise, end } = wayOut([route('hook', { webhook: { url: hook.url, secret } })])
  raise('desk')
  end('desk')
  await until('failed tries', async () => reports.length >= 3)
  await hook.restart()
  await hook.waitFor(2)
  await until('an empty outbox', async () => store.waiting() === 0)
  const events = hook.requests.map(
    ({ body, headers }) =>
      new Webhook(secret).verify(body, headers as Record<string, string>) as { type: string },
  )
  expect(events.map(({ type }) => type)).toEqual(['io.tautline.shift.confirmed', 'io.tautline.shift.ended'])
})

interface Read {
  readonly key: string
  readonly contentType: string
  readonly event: { type: string; subject: string; data: { version: number } }
  readonly partition: number
}

async function read(bootstrap: string, topic: string, count: number): Promise<Read[]> {
  const consumer = kafkaClient(bootstrap).consumer({ groupId: uniqueName('reader'), maxWaitTimeInMs: 100 })
  const found: Read[] = []
  await consumer.connect()
  await consumer.subscribe({ topic, fromBeginning: true })
  await consumer.run({
    eachMessage: async ({ message, partition }) => {
      found.push({
        key: String(message.key),
        contentType: String(message.headers?.['content-type']),
        event: JSON.parse(String(message.value)),
        partition,
      })
    },
  })
  await until(`${count} messages`, async () => found.length >= count)
  await consumer.disconnect()
  return found
}

test('on a Kafka topic the events of an ensemble keep their order under its key', async () => {
  const topic = uniqueName('alerts')
  await createTopic(inject('kafka'), topic, 4)
  const out = route('topic', { kafka: { brokers: [inject('kafka')], topic } })
  expect(await out.check(never)).toMatchObject({
    ok: true,
    detail: `topic ${topic} is there, with 4 partitions`,
  })
  const { store, raise, end } = wayOut([out])
  for (const ensemble of ['desk', 'plant']) {
    raise(ensemble)
    end(ensemble)
  }
  await until('an empty outbox', async () => store.waiting() === 0)
  expect(await out.trial(Date.now(), never)).toMatchObject({ ok: true })
  const found = await read(inject('kafka'), topic, 5)
  for (const ensemble of ['desk', 'plant']) {
    const mine = found.filter(({ key }) => key === ensemble)
    expect(mine.map(({ event }) => [event.type, event.data.version])).toEqual([
      ['io.tautline.shift.confirmed', 1],
      ['io.tautline.shift.ended', 2],
    ])
    expect(new Set(mine.map(({ partition }) => partition)).size).toBe(1)
  }
  expect(found.find(({ key }) => key === 'trial')?.event.type).toBe('io.tautline.trial')
  expect(new Set(found.map(({ contentType }) => contentType))).toEqual(
    new Set(['application/cloudevents+json; charset=utf-8']),
  )
})

test('a topic that is not there is a failure that says so, and nothing makes it', async () => {
  const topic = uniqueName('absent')
  const out = route('topic', { kafka: { brokers: [inject('kafka')], topic }, timeout: '5s' })
  for (const attempt of [await out.check(never), await out.trial(Date.now(), never)]) {
    expect(attempt.ok).toBe(false)
    expect(attempt.detail).toMatch(/does not host this topic-partition|no answer within/)
  }
})

test('a broker that is killed takes the alerts raised meanwhile once it is back', async () => {
  const broker = await KafkaBroker.start(inject('kafkaTools'))
  closing.push(() => broker.dispose())
  await broker.createTopic('alerts', 1)
  const out = route('topic', { kafka: { brokers: [broker.bootstrap], topic: 'alerts' }, timeout: '3s' })
  const { store, reports, raise, end } = wayOut([out])
  raise('desk')
  await until('the first', async () => store.waiting() === 0)
  await broker.kill()
  end('desk')
  await until('a failed try', async () => reports.some(({ outcome }) => outcome === 'failed'))
  await broker.restart()
  await until('an empty outbox', async () => store.waiting() === 0, { withinMs: 60_000 })
  const versions = (await read(broker.bootstrap, 'alerts', 2)).map(({ event }) => event.data.version)
  expect([...new Set(versions)]).toEqual([1, 2])
})
