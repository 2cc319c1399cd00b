import { writeFile } from 'node:fs/promises'
import { join } from 'node:path'
import { Webhook } from 'standardwebhooks'
import { afterEach, expect, inject, test } from 'vitest'
import { freePort, scratchFolder, until } from '../support/host.ts'
import { AlertmanagerProcess } from './support/alertmanager.ts'
import { removeFolder } from './support/child.ts'
import { Receiver } from './support/receiver.ts'
import { Tautline } from './support/tautline.ts'

const secret = `whsec_${Buffer.from('a key of thirty-two bytes, exact').toString('base64')}`

interface Event {
  readonly id: string
  readonly type: string
  readonly data: { readonly alert: string; readonly version: number; readonly sentence: string }
}

const closing: (() => Promise<unknown>)[] = []
afterEach(async () => {
  for (const close of closing.splice(0).reverse()) await close()
})

/** The demo with routes to a real Alertmanager and a webhook receiver. */
async function demoWithRoutes(speed: number) {
  const receiver = await Receiver.start()
  closing.push(() => receiver.stop())
  const alertmanager = await AlertmanagerProcess.start(inject('alertmanager').program)
  closing.push(() => alertmanager.dispose())
  const folder = await scratchFolder('alerting')
  closing.push(() => removeFolder(folder))
  const settings = join(folder, 'settings.yaml')
  await writeFile(
    settings,
    `
ensembles:
  any: { signals: [A, B], clock: { step: 5s }, window: { frames: 20 } }
routes:
  on-call: { alertmanager: { urls: ["${alertmanager.url}"], resend-every: 2s }, labels: { team: risk } }
  hook: { webhook: { url: "${receiver.url}", secret: "\${HOOK_SECRET}" } }
heartbeat: { every: 2s, routes: [on-call] }
store: { path: ./tautline.db }
page: { listen: "127.0.0.1:${await freePort()}" }
`,
  )
  const demo = new Tautline(
    ['demo', '--json', '--every', '1000', '--speed', String(speed), '--settings', settings],
    {
      HOOK_SECRET: secret,
    },
  )
  closing.push(async () => {
    if (demo.status === null) await demo.stop()
  })
  const events = (): Event[] =>
    receiver.requests.map(
      ({ headers, body }) => new Webhook(secret).verify(body, headers as Record<string, string>) as Event,
    )
  return { receiver, alertmanager, demo, events }
}

test('a shift of the demo reaches Alertmanager and a webhook whose signature holds, and ends there when steady again', async () => {
  const { alertmanager, demo, events } = await demoWithRoutes(900)
  await demo.page()
  const shiftsHeld = async () =>
    (await alertmanager.alerts()).filter(
      ({ labels }) => labels.alertname === 'TautlineShift' && labels.ensemble === 'desk',
    )

  await until('the heartbeat', async () =>
    (await alertmanager.alerts()).some(({ labels }) => labels.alertname === 'TautlineHeartbeat'),
  )
  await until('the alert', async () => (await shiftsHeld()).length > 0, { withinMs: 60_000 })
  const [held] = await shiftsHeld()
  expect(held!.labels).toMatchObject({ ensemble: 'desk', kind: 'strength', shift: '1', team: 'risk' })
  expect(held!.annotations.caution).toContain('advice')

  await until('the end', async () => !(await shiftsHeld()).some(({ labels }) => labels.shift === '1'), {
    withinMs: 60_000,
  })
  await until(
    'both events',
    async () => events().filter(({ type }) => type.startsWith('io.tautline.shift')).length >= 2,
  )
  const [confirmed, ended] = events().filter(({ data }) => data.alert.startsWith('desk/1/'))
  expect([confirmed!.type, ended!.type]).toEqual(['io.tautline.shift.confirmed', 'io.tautline.shift.ended'])
  expect(confirmed!.data.sentence).toContain('Northern desk')
  expect(await demo.stop(), demo.stderr).toBe(0)
})

test('Alertmanager down for two minutes loses nothing', async () => {
  const { alertmanager, demo, events } = await demoWithRoutes(300)
  const page = await demo.page()
  const metric = async (name: string): Promise<number> => {
    const text = await (await fetch(`${page}metrics`)).text()
    return Number(
      text
        .split('\n')
        .find((line) => line.startsWith(name))
        ?.split(' ')
        .at(-1) ?? Number.NaN,
    )
  }
  await alertmanager.stop()
  await new Promise((resolve) => setTimeout(resolve, 120_000))
  const versions = new Set(events().map(({ data: { alert, version } }) => `${alert}/${version}`))
  expect(versions.size).toBeGreaterThanOrEqual(4)
  expect(await metric('tautline_alerts_waiting')).toBeGreaterThanOrEqual(4)

  await alertmanager.restart()
  await until('the outbox to empty', async () => (await metric('tautline_alerts_waiting')) === 0, {
    withinMs: 90_000,
  })
  expect(await metric('tautline_alert_deliveries_total{route="on-call",outcome="given-up"}')).toBe(0)
  const told = demo.stderr + demo.stdout
  expect(told).not.toContain('given up')
  expect(await demo.stop(), demo.stderr).toBe(0)
}, 400_000)
