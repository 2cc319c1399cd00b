import { expect, test } from 'vitest'
import type { Pulse } from '../../src/alerts/alert.ts'
import { Heartbeat } from '../../src/alerts/heartbeat.ts'
import { sent } from '../../src/alerts/route.ts'
import type { DeliveryReport } from '../../src/alerts/settlement.ts'
import { down, FakeRoute } from './support/fake-route.ts'
import { FakeTime } from './support/fake-time.ts'

function house() {
  const time = new FakeTime()
  const routes = [new FakeRoute(time, 'one'), new FakeRoute(time, 'two')]
  const reports: DeliveryReport[] = []
  const logged: string[] = []
  const state: { pulse: Pulse | null } = { pulse: { ensembles: { desk: 'steady' }, now: time.now() } }
  const heartbeat = new Heartbeat({
    routes,
    everyMs: 60_000,
    now: time.now,
    after: time.after,
    pulse: () => state.pulse,
    report: (report) => reports.push(report),
    log: (level, sentence, { route }) => logged.push(`${level}: ${route}: ${sentence}`),
  })
  return { time, routes: routes as [FakeRoute, FakeRoute], reports, logged, state, heartbeat }
}

test('it beats at once and on schedule on every route, until it is stopped', async () => {
  const { time, routes, reports, heartbeat } = house()
  const start = time.now()
  heartbeat.start()
  heartbeat.start()
  await time.advance(150_000)
  for (const route of routes) expect(route.tried.map(({ at }) => at - start)).toEqual([0, 60_000, 120_000])
  expect(reports).toHaveLength(6)
  await heartbeat.stop()
  await time.advance(300_000)
  expect(routes[0].tried).toHaveLength(3)
  expect(time.pending).toBe(0)
})

test('a monitor that has stalled keeps silent', async () => {
  const { time, routes, state, heartbeat } = house()
  heartbeat.start()
  await time.advance(60_000)
  state.pulse = null
  await time.advance(300_000)
  expect(routes[0].tried).toHaveLength(2)
  await heartbeat.stop()
})

test('a route that fails is logged once, and once when it is back; a slow one gets no second beat on top', async () => {
  const { time, routes, logged, heartbeat } = house()
  routes[0].answer = down
  let answer = () => {}
  routes[1].answer = () =>
    new Promise((resolve) => {
      answer = () => resolve(sent('taken'))
    })
  heartbeat.start()
  await time.advance(150_000)
  expect(routes[0].tried).toHaveLength(3)
  expect(routes[1].tried).toHaveLength(1)
  routes[0].answer = () => sent('taken')
  answer()
  await time.advance(60_000)
  expect(routes[1].tried).toHaveLength(2)
  expect(logged).toEqual([
    'warn: one: The route takes no heartbeats.',
    'info: one: The route takes heartbeats again.',
  ])
  answer()
  await heartbeat.stop()
})
