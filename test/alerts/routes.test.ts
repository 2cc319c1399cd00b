import { createServer, type ServerResponse } from 'node:http'
import type { AddressInfo } from 'node:net'
import type { Kafka } from 'kafkajs'
import { Webhook } from 'standardwebhooks'
import { afterEach, describe, expect, test } from 'vitest'
import { trialAlert } from '../../src/alerts/alert-book.ts'
import { retryAfter } from '../../src/alerts/http-post.ts'
import { openRoute } from '../../src/alerts/open-route.ts'
import type { Message, Route } from '../../src/alerts/route.ts'
import { type RouteSettings, settingsSchema } from '../../src/settings/schema.ts'
import { Receiver } from '../services/support/receiver.ts'
import { freePort } from '../support/host.ts'
import { at, book, raisedAndEnded, shiftEvent } from './support/shifts.ts'

const never = new AbortController().signal
const secret = `whsec_${Buffer.from('a key of thirty-two bytes, really').toString('base64')}`
const closing: (() => Promise<unknown>)[] = []
afterEach(async () => {
  await Promise.all(closing.splice(0).map((close) => close()))
})

async function receiver(): Promise<Receiver> {
  const started = await Receiver.start()
  closing.push(() => started.stop())
  return started
}

/** A server that answers as the test says, below the level of a whole answer. */
async function rawServer(answer: (response: ServerResponse) => void): Promise<string> {
  const server = createServer((_, response) => answer(response))
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve))
  closing.push(async () => {
    server.closeAllConnections()
    await new Promise((resolve) => server.close(resolve))
  })
  return `http://127.0.0.1:${(server.address() as AddressInfo).port}`
}

const parse = (settings: unknown): RouteSettings =>
  settingsSchema.parse({ ensembles: {}, routes: { 'on-call': settings } }).routes['on-call']!

const logged: unknown[][] = []
function open(settings: unknown): Route {
  const route = openRoute('on-call', parse(settings), {
    log: (...line) => logged.push(line),
    source: 'https://monitor.example:8450/',
    kafka: () => ({}) as Kafka,
  })
  if (!route.ok) throw route.error
  return route.value
}

function codeOf(settings: unknown): string | null {
  const route = openRoute('on-call', parse(settings), {
    log: () => {},
    kafka: () => ({}) as Kafka,
  })
  return route.ok ? null : route.error.code
}

const message = (alert = raisedAndEnded()[0]): Message => ({ type: 'alert', alert })
const pulse: Message = {
  type: 'heartbeat',
  pulse: { ensembles: { desk: 'steady', plant: 'straining' }, now: at('10:42:30') },
  everyMs: 60_000,
}

describe('webhook', () => {
  const webhook = (url: string, over: object = {}) => open({ webhook: { url, secret }, ...over })

  test('the signature is verified by an independent implementation of Standard Webhooks', async () => {
    const hook = await receiver()
    const route = webhook(`${hook.url}/alerts`)
    // The independent implementation refuses time stamps far from the present.
    expect(await route.send(message(), Date.now(), never)).toMatchObject({ ok: true })
    const [request] = hook.requests
    const headers = request!.headers as Record<string, string>
    const event = new Webhook(secret).verify(request!.body, headers) as Record<string, unknown>
    expect(event.type).toBe('io.tautline.shift.confirmed')
    expect(request!.path).toBe('/alerts')
    expect(() => new Webhook(secret).verify(`${request!.body} `, headers)).toThrow()
    expect(() => new Webhook(secret).verify(request!.body, { ...headers, 'webhook-id': 'other' })).toThrow()
  })

  test('a plain secret is its own bytes', async () => {
    const hook = await receiver()
    const plain = 'plain words of more than 24 bytes'
    await open({ webhook: { url: hook.url, secret: plain } }).send(message(), Date.now(), never)
    const [request] = hook.requests
    const verifier = new Webhook(plain, { format: 'raw' })
    expect(() => verifier.verify(request!.body, request!.headers as Record<string, string>)).not.toThrow()
  })

  test('the example of the Standard Webhooks specification comes out as printed there', async () => {
    // Secret, id, time stamp, body and signature from memory of the specification's own example; held
    // against the independent implementation here.
    const specSecret = 'whsec_MfKQ9r8GKYqrTwjUPD8ILPZIo2LaLaSw'
    const body = '{"test": 2432232314}'
    const { webhookHeaders, webhookKey } = await import('../../src/alerts/webhook-signature.ts')
    const key = webhookKey(specSecret)
    if (!key.ok) throw key.error
    const headers = webhookHeaders('msg_p5jXN8AQM9LWM0D4loKWxJek', body, key.value, 1614265330_000)
    const sign = new Webhook(specSecret).sign('msg_p5jXN8AQM9LWM0D4loKWxJek', new Date(1614265330_000), body)
    expect(headers['webhook-signature']).toBe(sign)
    expect(sign).toBe('v1,g0hM9SsE+OTPJTGt/tmIKtSyZlE3uFJELVlNIOLJ1OE=')
  })

  test('the body is a CloudEvents 1.0 event with the numbers of the shift; repetitions have the same id', async () => {
    const hook = await receiver()
    const route = webhook(hook.url)
    const [raised, ended] = raisedAndEnded()
    for (const [alert, now] of [
      [raised, at('10:42:08')],
      [raised, at('10:43:08')],
      [ended, at('11:30:03')],
    ] as const)
      await route.send(message(alert), now, never)
    const [first, second, third] = hook.requests.map(({ body }) => JSON.parse(body))
    expect(hook.requests[0]!.headers['content-type']).toBe('application/cloudevents+json; charset=utf-8')
    expect(first).toMatchObject({
      specversion: '1.0',
      id: 'desk/3/2026-11-02T10:39:50Z/1',
      source: 'https://monitor.example:8450/',
      type: 'io.tautline.shift.confirmed',
      subject: 'desk',
      time: '2026-11-02T10:42:07Z',
      datacontenttype: 'application/json',
      data: {
        alert: 'desk/3/2026-11-02T10:39:50Z',
        state: 'unacknowledged',
        ended: null,
        shift: {
          number: 3,
          kind: 'strength',
          start: '2026-11-02T10:39:50Z',
          share_before: 0.213,
          carriers: [
            { signal: 'QUAY', share: 0.31 },
            { signal: 'MAST', share: 0.22 },
            { signal: 'KEEL', share: -0.02 },
          ],
        },
      },
    })
    expect(second).toEqual(first)
    expect(third).toMatchObject({
      id: 'desk/3/2026-11-02T10:39:50Z/2',
      type: 'io.tautline.shift.ended',
      data: { ended: '2026-11-02T11:30:00Z', state: 'returned-to-normal' },
    })
    expect(hook.requests[0]!.headers['webhook-id']).toBe('desk/3/2026-11-02T10:39:50Z/1')
    expect(hook.requests[1]!.headers['webhook-timestamp']).toBe(String(at('10:43:08') / 1000))
  })

  test('the webhook id holds no full stop, which parts the signed fields', async () => {
    const hook = await receiver()
    const [alert] = book().take(shiftEvent({ start: at('10:39:50') + 125 }))
    await webhook(hook.url).send(message(alert), Date.now(), never)
    expect(hook.requests[0]!.headers['webhook-id']).toBe('desk/3/2026-11-02T10:39:50_125Z/1')
    expect(JSON.parse(hook.requests[0]!.body).id).toBe('desk/3/2026-11-02T10:39:50.125Z/1')
  })

  test('acts, trials and heartbeats have types of their own', async () => {
    const hook = await receiver()
    const route = webhook(hook.url)
    const alerts = book()
    const [raised] = alerts.take(shiftEvent())
    const acted = alerts.act(raised!.id, { type: 'acknowledge', by: 'alice' }, at('10:50:00'))
    await route.send(message((acted.ok && acted.value) || undefined), at('10:50:01'), never)
    await route.trial(at('10:51:00'), never)
    await route.send(pulse, at('10:52:00'), never)
    const events = hook.requests.map(({ body }) => JSON.parse(body))
    expect(events.map(({ type }) => type)).toEqual([
      'io.tautline.shift.changed',
      'io.tautline.trial',
      'io.tautline.heartbeat',
    ])
    expect(events[0].data.change).toEqual({ what: 'acknowledged', by: 'alice', reason: null })
    expect(events[2].data).toEqual({ ensembles: { desk: 'steady', plant: 'straining' }, every_seconds: 60 })
  })

  test('redirects are not followed', async () => {
    const elsewhere = await receiver()
    const hook = await receiver()
    hook.reply = () => ({ status: 307, headers: { location: elsewhere.url } })
    const attempt = await webhook(hook.url).send(message(), Date.now(), never)
    expect(attempt).toMatchObject({ ok: false, routeWide: true })
    expect(attempt.detail).toContain('a redirect, which is not followed')
    expect(elsewhere.requests).toEqual([])
  })

  test('what a status says: of this message only, or of the whole route', async () => {
    const hook = await receiver()
    const route = webhook(hook.url)
    for (const [status, routeWide] of [
      [400, false],
      [413, false],
      [422, false],
      [401, true],
      [404, true],
      [429, true],
      [500, true],
      [503, true],
    ] as const) {
      hook.reply = () => ({ status, body: 'why\nnot\u0007' })
      const attempt = await route.send(message(), Date.now(), never)
      expect(attempt).toMatchObject({ ok: false, routeWide, retryAfterMs: null })
      expect(attempt.detail).toBe(`127.0.0.1:${hook.port} answered ${status}: why not`)
    }
  })

  test('Retry-After is read as seconds or as a date, and bounded by a day', async () => {
    const now = at('10:00:00')
    expect(retryAfter('120', now)).toBe(120_000)
    expect(retryAfter('Mon, 02 Nov 2026 10:05:00 GMT', now)).toBe(300_000)
    expect(retryAfter('Mon, 02 Nov 2026 09:00:00 GMT', now)).toBe(0)
    expect(retryAfter('999999999', now)).toBe(86_400_000)
    for (const bad of [null, '', 'soon', '-5', '1e9']) expect(retryAfter(bad, now)).toBeNull()
    const hook = await receiver()
    hook.reply = () => ({ status: 429, headers: { 'retry-after': '7' } })
    expect(await webhook(hook.url).send(message(), now, never)).toMatchObject({ retryAfterMs: 7000 })
  })

  test('an answer that never comes and one that never ends are failures within the timeout', async () => {
    const silent = await rawServer(() => {})
    const endless = await rawServer((response) => {
      response.writeHead(500)
      const drip = setInterval(() => response.write('.'), 20)
      response.on('close', () => clearInterval(drip))
    })
    for (const url of [silent, endless]) {
      const attempt = await webhook(url, { timeout: '300ms' }).send(message(), Date.now(), never)
      expect(attempt).toMatchObject({ ok: false, routeWide: true })
      expect(attempt.detail).toContain('did not answer within 300 ms')
    }
  })

  test('of a success with an endless body nothing is read', async () => {
    const endless = await rawServer((response) => {
      response.writeHead(200)
      const drip = setInterval(() => response.write('x'.repeat(1000)), 5)
      response.on('close', () => clearInterval(drip))
    })
    expect(await webhook(endless).send(message(), Date.now(), never)).toMatchObject({ ok: true })
  })

  test('of a long refusal only the start is read', async () => {
    const long = await rawServer((response) => response.writeHead(500).end('y'.repeat(5_000_000)))
    const attempt = await webhook(long).send(message(), Date.now(), never)
    expect(attempt.detail.length).toBeLessThan(300)
  })

  test('nobody there, no such host, and a stop are failures that name no secret', async () => {
    const nobody = `http://127.0.0.1:${await freePort()}`
    const gone = await webhook(nobody).send(message(), Date.now(), never)
    expect(gone.detail).toContain('ECONNREFUSED')
    const nowhere = await webhook('http://nowhere.invalid/').send(message(), Date.now(), never)
    expect(nowhere).toMatchObject({ ok: false, routeWide: true })
    const silent = await rawServer(() => {})
    const stopping = new AbortController()
    const sending = webhook(silent).send(message(), Date.now(), stopping.signal)
    stopping.abort()
    expect(await sending).toMatchObject({ ok: false, detail: 'the monitor is stopping' })
    for (const { detail } of [gone, nowhere]) expect(detail).not.toContain(secret)
  })

  test('check opens a connection and sends nothing', async () => {
    const hook = await receiver()
    expect(await webhook(hook.url).check(never)).toMatchObject({ ok: true })
    expect(hook.requests).toEqual([])
    const nobody = webhook(`http://127.0.0.1:${await freePort()}`)
    expect(await nobody.check(never)).toMatchObject({ ok: false })
  })

  test('secrets that cannot be used have codes', () => {
    expect(codeOf({ webhook: { url: 'https://example.net', secret: 'whsec_???' } })).toBe('route-secret')
    expect(codeOf({ webhook: { url: 'https://example.net', secret: 'whsec_c2hvcnQ=' } })).toBe('route-secret')
    expect(codeOf({ webhook: { url: 'https://example.net', secret: 'short' } })).toBe('route-secret')
    expect(codeOf({ webhook: { url: 'https://example.net', secret } })).toBeNull()
  })
})

describe('alertmanager', () => {
  const route = (urls: string[], over: object = {}, extra: object = {}) =>
    open({ alertmanager: { urls, ...over }, labels: { team: 'risk' }, ...extra })
  const bodies = (from: Receiver) => from.requests.map(({ body }) => JSON.parse(body)[0])

  test('an alert stands for four intervals; its end is now; the labels are the same', async () => {
    const manager = await receiver()
    const onCall = route([`${manager.url}/am/`])
    const [raised, ended] = raisedAndEnded()
    await onCall.send(message(raised), at('10:42:08'), never)
    await onCall.send(message(ended), at('11:30:03'), never)
    expect(manager.requests.map(({ path }) => path)).toEqual(['/am/api/v2/alerts', '/am/api/v2/alerts'])
    expect(manager.requests[0]!.headers['content-type']).toBe('application/json')
    const [first, second] = bodies(manager)
    expect(first).toEqual({
      labels: {
        alertname: 'TautlineShift',
        ensemble: 'desk',
        kind: 'strength',
        shift: '3',
        severity: 'warning',
        team: 'risk',
      },
      annotations: {
        summary: raised.sentence,
        description: raised.details.join('\n'),
        caution: raised.cautions.join(' '),
        runbook_url: 'https://runbooks.example/desk',
        carriers: 'QUAY 0.31, MAST 0.22, KEEL -0.02',
        state: 'unacknowledged',
      },
      startsAt: '2026-11-02T10:39:50Z',
      endsAt: '2026-11-02T10:46:08Z',
      generatorURL: 'https://monitor.example:8450/?ensemble=desk',
    })
    expect(second.labels).toEqual(first.labels)
    expect(second).toMatchObject({ endsAt: '2026-11-02T11:30:03Z', annotations: { summary: ended.sentence } })
  })

  test('the end is repeated for five minutes after it was first told, and then no more', async () => {
    const manager = await receiver()
    const onCall = route([manager.url])
    const [, ended] = raisedAndEnded()
    await onCall.send(message(ended), at('12:00:00'), never)
    expect(await onCall.resend([], at('12:04:59'), never)).toMatchObject({ ok: true })
    expect(bodies(manager).map(({ endsAt }) => endsAt)).toEqual([
      '2026-11-02T12:00:00Z',
      '2026-11-02T12:04:59Z',
    ])
    expect(await onCall.resend([], at('12:05:00'), never)).toBeNull()
  })

  test('what stands is told again in one request', async () => {
    const manager = await receiver()
    const onCall = route([manager.url])
    const alerts = [raisedAndEnded()[0], raisedAndEnded({}, 'plant')[0]]
    await onCall.resend(alerts, at('11:00:00'), never)
    expect(
      JSON.parse(manager.requests[0]!.body).map((alert: { labels: object }) => alert.labels),
    ).toMatchObject([{ ensemble: 'desk' }, { ensemble: 'plant' }])
  })

  test('a start ahead of the wall clock, as recorded readings may give, is told as now', async () => {
    const manager = await receiver()
    await route([manager.url]).send(message(), at('08:00:00'), never)
    expect(bodies(manager)[0]).toMatchObject({
      startsAt: '2026-11-02T08:00:00Z',
      endsAt: '2026-11-02T08:04:00Z',
    })
  })

  test('a shelved alert is ended there and raised again when it returns', async () => {
    const manager = await receiver()
    const onCall = route([manager.url])
    const alerts = book()
    const [raised] = alerts.take(shiftEvent())
    const until = at('12:00:00')
    const shelved = alerts.act(raised!.id, { type: 'shelve', by: 'a', reason: 'test', until }, at('11:00:00'))
    await onCall.send(message((shelved.ok && shelved.value) || undefined), at('11:00:01'), never)
    await onCall.send(message(alerts.wake(until)[0]), until, never)
    expect(bodies(manager)).toMatchObject([
      { endsAt: '2026-11-02T11:00:01Z', annotations: { state: 'shelved' } },
      { endsAt: '2026-11-02T12:04:00Z', annotations: { state: 'unacknowledged' } },
    ])
  })

  test('the heartbeat keeps its labels and its start, tells the states and ends when it is not repeated', async () => {
    const manager = await receiver()
    const onCall = route([manager.url])
    await onCall.send(pulse, at('10:42:30'), never)
    const later = { ...pulse, pulse: { ensembles: { desk: 'shifted' as const }, now: at('10:43:30') } }
    await onCall.send(later, at('10:43:30'), never)
    const [first, second] = bodies(manager)
    expect(first).toMatchObject({
      labels: { alertname: 'TautlineHeartbeat', severity: 'none', team: 'risk' },
      annotations: { description: 'Ensembles: desk steady, plant straining.' },
      startsAt: '2026-11-02T10:42:30Z',
      endsAt: '2026-11-02T10:46:30Z',
    })
    expect(second).toMatchObject({ labels: first.labels, startsAt: first.startsAt })
    expect(second.annotations.description).toBe('Ensembles: desk shifted.')
  })

  test('a trial has a name of its own and ends by itself', async () => {
    const manager = await receiver()
    const onCall = route([manager.url])
    expect(await onCall.trial(at('10:00:00'), never)).toMatchObject({ ok: true })
    expect(bodies(manager)[0]).toMatchObject({
      labels: { alertname: 'TautlineTrial', severity: 'info' },
      endsAt: '2026-11-02T10:05:00Z',
      annotations: { summary: trialAlert(at('10:00:00')).sentence },
    })
    expect(await onCall.resend([], at('10:01:00'), never)).toBeNull()
  })

  test('every instance is told; one that takes it is enough, none is a failure', async () => {
    const [one, two] = [await receiver(), await receiver()]
    const onCall = route([one.url, two.url])
    two.reply = () => ({ status: 503, headers: { 'retry-after': '5' } })
    const half = await onCall.send(message(), Date.now(), never)
    expect(half.ok).toBe(true)
    expect(half.detail).toContain('answered 503')
    expect([one.requests.length, two.requests.length]).toEqual([1, 1])
    one.reply = () => ({ status: 400 })
    expect(await onCall.send(message(), Date.now(), never)).toMatchObject({
      ok: false,
      routeWide: true,
      retryAfterMs: 5000,
    })
    two.reply = () => ({ status: 400 })
    expect(await onCall.send(message(), Date.now(), never)).toMatchObject({ ok: false, routeWide: false })
  })

  test('user name and password go as basic authentication', async () => {
    const manager = await receiver()
    await route([manager.url], { username: 'tautline', password: 'påss' }).send(message(), Date.now(), never)
    const credentials = Buffer.from('tautline:påss').toString('base64')
    expect(manager.requests[0]!.headers.authorization).toBe(`Basic ${credentials}`)
  })

  test('labels of the route may set the severity, not the identity', async () => {
    const manager = await receiver()
    await route([manager.url], {}, { labels: { severity: 'critical' } }).send(message(), Date.now(), never)
    expect(bodies(manager)[0].labels.severity).toBe('critical')
    for (const label of ['alertname', 'ensemble', 'kind', 'shift'])
      expect(codeOf({ alertmanager: { urls: [manager.url] }, labels: { [label]: 'x' } })).toBe('route-label')
  })
})

test('the log route writes the sentence, as a warning while somebody is called', async () => {
  logged.length = 0
  const route = open({ log: {} })
  const [raised, ended] = raisedAndEnded()
  await route.send(message(raised), at('10:42:08'), never)
  await route.send(message(ended), at('11:30:03'), never)
  await route.send(pulse, at('11:31:00'), never)
  await route.trial(at('11:32:00'), never)
  expect(logged.map(([level, sentence]) => [level, sentence])).toEqual([
    ['warn', raised.sentence],
    ['info', ended.sentence],
    ['info', 'The monitor is alive.'],
    ['info', trialAlert(at('11:32:00')).sentence],
  ])
  expect(logged[0]![2]).toMatchObject({ route: 'on-call', event: { type: 'io.tautline.shift.confirmed' } })
})
