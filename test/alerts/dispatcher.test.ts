import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import type { Alert } from '../../src/alerts/alert.ts'
import { backoffMs } from '../../src/alerts/backoff.ts'
import { Dispatcher } from '../../src/alerts/dispatcher.ts'
import { postAlerts } from '../../src/alerts/outbox.ts'
import { sent, unsent } from '../../src/alerts/route.ts'
import type { DeliveryReport, DispatcherParts } from '../../src/alerts/settlement.ts'
import { openStore } from '../../src/store/open-store.ts'
import { down, FakeRoute } from './support/fake-route.ts'
import { FakeTime } from './support/fake-time.ts'
import { raisedAndEnded } from './support/shifts.ts'

const second = 1000
const minute = 60_000

function house(make: (time: FakeTime) => FakeRoute[], over: Partial<DispatcherParts> = {}) {
  const time = new FakeTime()
  const routes = make(time)
  const store = openStore(':memory:')
  const reports: DeliveryReport[] = []
  const logged: string[] = []
  const standing: Alert[] = []
  const parts: DispatcherParts = {
    store,
    routes,
    now: time.now,
    after: time.after,
    random: () => 0.5,
    standing: () => standing,
    report: (report) => reports.push(report),
    log: (level, sentence) => logged.push(`${level}: ${sentence}`),
    ...over,
  }
  const dispatcher = new Dispatcher(parts)
  const raise = (...alerts: Alert[]) => {
    postAlerts(store, alerts, routes, time.now())
    dispatcher.poke()
  }
  return { time, routes, store, reports, logged, standing, parts, dispatcher, raise }
}

const outcomes = (reports: readonly DeliveryReport[]) => reports.map(({ outcome }) => outcome)

test('what is posted goes out at once, is settled, reported and journalled', async () => {
  const { time, routes, store, reports, dispatcher, raise } = house((time) => [new FakeRoute(time)])
  dispatcher.start()
  const [raised, ended] = raisedAndEnded()
  raise(raised, ended)
  await time.advance(0)
  expect(routes[0]!.taken).toEqual(['desk/3/1', 'desk/3/2'])
  expect(store.waiting()).toBe(0)
  expect(outcomes(reports)).toEqual(['delivered', 'delivered'])
  expect(store.readJournal({ kind: 'delivery', ensemble: 'desk' }).map(({ body }) => body)).toEqual([
    { route: 'hook', alert: raised.id, version: 1, outcome: 'delivered', attempts: 1, detail: 'taken' },
    { route: 'hook', alert: raised.id, version: 2, outcome: 'delivered', attempts: 1, detail: 'taken' },
  ])
  await dispatcher.stop()
})

test('a route down for two minutes loses nothing and takes all in order; the others wait for nobody', async () => {
  const { time, routes, store, logged, dispatcher, raise } = house((time) => [
    new FakeRoute(time, 'hook'),
    new FakeRoute(time, 'topic'),
  ])
  const [hook, topic] = routes as [FakeRoute, FakeRoute]
  hook.answer = down
  dispatcher.start()
  const desk = raisedAndEnded()
  const plant = raisedAndEnded({ number: 1 }, 'plant')
  raise(desk[0])
  await time.advance(40 * second)
  raise(plant[0], desk[1])
  await time.advance(80 * second)
  expect(topic.taken[0]).toBe('desk/3/1')
  expect(topic.taken.toSorted()).toEqual(['desk/3/1', 'desk/3/2', 'plant/1/1'])
  expect(hook.taken).toEqual([])
  expect(store.waiting()).toBe(3)
  hook.answer = () => sent('taken')
  await time.advance(minute)
  expect(hook.taken.toSorted()).toEqual(['desk/3/1', 'desk/3/2', 'plant/1/1'])
  expect(hook.taken.indexOf('desk/3/1')).toBeLessThan(hook.taken.indexOf('desk/3/2'))
  expect(store.waiting()).toBe(0)
  expect(logged).toEqual([
    'warn: The route takes no alerts; they wait in the outbox.',
    'info: The route takes alerts again.',
  ])
  await dispatcher.stop()
})

test('waits double up to a minute, with half of each by chance', async () => {
  const backoff = { firstMs: 1000, longestMs: 60_000 }
  expect([1, 2, 3, 6, 7, 99].map((n) => backoffMs(n, 0, backoff))).toEqual([
    500, 1000, 2000, 16e3, 30e3, 30e3,
  ])
  expect(backoffMs(3, 0.999, backoff)).toBeCloseTo(4000, -1)
  const { time, routes, dispatcher, raise } = house((time) => [new FakeRoute(time)], { pollMs: 250 })
  routes[0]!.answer = down
  dispatcher.start()
  raise(raisedAndEnded()[0])
  await time.advance(5 * minute)
  const gaps = routes[0]!.tried.slice(1).map(({ at }, i) => at - routes[0]!.tried[i]!.at)
  expect(gaps).toEqual([750, 1500, 3000, 6000, 12e3, 24e3, 45e3, 45e3, 45e3, 45e3, 45e3])
  await dispatcher.stop()
})

test('a wait that the other side asks for is kept, for the whole route', async () => {
  const { time, routes, dispatcher, raise } = house((time) => [new FakeRoute(time)])
  const hook = routes[0]!
  hook.answer = () => unsent('429', { retryAfterMs: 90 * second })
  dispatcher.start()
  raise(raisedAndEnded()[0], raisedAndEnded({}, 'plant')[0])
  await time.advance(89 * second)
  expect(hook.tried).toHaveLength(1)
  hook.answer = () => sent('taken')
  await time.advance(2 * second)
  expect(hook.taken.toSorted()).toEqual(['desk/3/1', 'plant/3/1'])
  await dispatcher.stop()
})

test('a message that the other side refuses does not hold up other alerts, only later versions of its own', async () => {
  const { time, routes, store, dispatcher, raise } = house((time) => [new FakeRoute(time)])
  const hook = routes[0]!
  hook.answer = (what) => (what === 'desk/3/1' ? unsent('400', { routeWide: false }) : sent('taken'))
  dispatcher.start()
  raise(...raisedAndEnded(), ...raisedAndEnded({}, 'plant'))
  await time.advance(5 * minute)
  expect(hook.taken).toEqual(['plant/3/1', 'plant/3/2'])
  expect(store.waiting()).toBe(2)
  await dispatcher.stop()
})

test('after its time a delivery is given up, and that is said in log, journal and report; the next version goes on', async () => {
  const { time, routes, store, reports, logged, dispatcher, raise } = house((time) => [
    new FakeRoute(time, 'hook', { giveUpAfterMs: 10 * minute }),
  ])
  const hook = routes[0]!
  hook.answer = down
  dispatcher.start()
  const [raised, ended] = raisedAndEnded()
  raise(raised)
  await time.advance(9 * minute)
  raise(ended)
  expect(outcomes(reports)).not.toContain('given-up')
  await time.advance(2 * minute)
  expect(reports.filter(({ outcome }) => outcome === 'given-up')).toEqual([
    { route: 'hook', what: 'alert', outcome: 'given-up', detail: 'ECONNREFUSED' },
  ])
  expect(logged).toContain('error: An alert was given up: its route did not take it in time.')
  expect(store.readJournal({ kind: 'delivery' })).toMatchObject([
    { body: { version: 1, outcome: 'given-up', detail: 'ECONNREFUSED' } },
  ])
  hook.answer = () => sent('taken')
  await time.advance(minute)
  expect(hook.taken).toEqual(['desk/3/2'])
  await dispatcher.stop()
})

test('after a long stop even a delivery whose time is over gets one try', async () => {
  const { time, routes, store, parts, raise } = house((time) => [
    new FakeRoute(time, 'hook', { giveUpAfterMs: minute }),
  ])
  raise(raisedAndEnded()[0])
  store.retryAt(store.due(time.now(), 1)[0]!.key, 5, time.now(), 'refused before the stop')
  await time.advance(4 * 86_400_000)
  const dispatcher = new Dispatcher(parts)
  dispatcher.start()
  await time.advance(0)
  expect(routes[0]!.taken).toEqual(['desk/3/1'])
  await dispatcher.stop()
})

test('deliveries of a route that the settings no longer name wait, and are given up when their time is over', async () => {
  const { time, store, reports, parts, raise } = house((time) => [
    new FakeRoute(time, 'old', { giveUpAfterMs: 10 * minute }),
  ])
  raise(raisedAndEnded()[0])
  const other = new FakeRoute(time, 'new')
  const dispatcher = new Dispatcher({ ...parts, routes: [other] })
  dispatcher.start()
  await time.advance(9 * minute)
  expect(store.waiting()).toBe(1)
  await time.advance(2 * minute)
  expect(store.waiting()).toBe(0)
  expect(reports).toEqual([
    { route: 'old', what: 'alert', outcome: 'given-up', detail: 'no route is called old' },
  ])
  await dispatcher.stop()
})

describe('repetition', () => {
  const alertmanager = (time: FakeTime) => [new FakeRoute(time, 'on-call', { resendEveryMs: minute })]

  test('what stands is told again on schedule, and at once after a start', async () => {
    const { time, routes, standing, dispatcher } = house(alertmanager)
    const [raised] = raisedAndEnded()
    standing.push(raised)
    const start = time.now()
    dispatcher.start()
    await time.advance(3 * minute - 1)
    expect(routes[0]!.repeated.map(({ what, at }) => [what, at - start])).toEqual([
      [['desk/1'], 0],
      [['desk/1'], minute],
      [['desk/1'], 2 * minute],
    ])
    await dispatcher.stop()
  })

  test('an alert with a version on its way is left out, so that no later state overtakes an earlier one', async () => {
    const { time, routes, standing, dispatcher, raise } = house(alertmanager)
    const [raised, ended] = raisedAndEnded()
    const other = raisedAndEnded({}, 'plant')[0]
    standing.push(ended, other)
    routes[0]!.answer = (what) => (what === 'desk/3/1' ? unsent('400', { routeWide: false }) : sent('taken'))
    dispatcher.start()
    raise(raised, ended)
    await time.advance(2 * minute)
    expect(routes[0]!.repeated.length).toBeGreaterThan(1)
    // The one of the start is told before anything waits.
    for (const { what } of routes[0]!.repeated.slice(1)) expect(what).toEqual(['plant/1'])
    await dispatcher.stop()
  })

  test('a route that was away is told of what stands as soon as it answers', async () => {
    const { time, routes, standing, reports, dispatcher } = house(alertmanager)
    standing.push(raisedAndEnded()[0])
    routes[0]!.answer = down
    dispatcher.start()
    await time.advance(2 * minute)
    expect(reports.every(({ what, outcome }) => what === 'repetition' && outcome === 'failed')).toBe(true)
    expect(reports.length).toBeGreaterThan(3)
    routes[0]!.answer = () => sent('taken')
    const back = time.now()
    await time.advance(minute)
    expect(routes[0]!.repeated.at(-1)!.at - back).toBeLessThanOrEqual(minute)
    await dispatcher.stop()
  })

  test('a lane carries one message at a time, repetitions too', async () => {
    const { time, routes, standing, dispatcher, raise } = house(alertmanager)
    standing.push(raisedAndEnded({}, 'plant')[0])
    let open = 0
    let most = 0
    routes[0]!.answer = async () => {
      most = Math.max(most, ++open)
      await new Promise<void>((resolve) => {
        time.after(7 * second, resolve)
      })
      open--
      return sent('taken')
    }
    dispatcher.start()
    raise(...raisedAndEnded())
    await time.advance(5 * minute)
    expect(most).toBe(1)
    expect(routes[0]!.taken).toEqual(['desk/3/1', 'desk/3/2'])
    await dispatcher.stop()
  })
})

describe('faults of the house', () => {
  test('a clock that is set back by an hour holds up nothing', async () => {
    const { time, routes, dispatcher, raise } = house((time) => [new FakeRoute(time)])
    routes[0]!.answer = down
    dispatcher.start()
    raise(raisedAndEnded()[0])
    await time.advance(10 * minute)
    time.setBack(60 * minute)
    routes[0]!.answer = () => sent('taken')
    await time.advance(2 * second)
    expect(routes[0]!.taken).toEqual(['desk/3/1'])
    await dispatcher.stop()
  })

  test('a store that refuses to settle makes a repetition, never a loss or an end of the dispatcher', async () => {
    const { time, routes, store, parts, raise } = house((time) => [new FakeRoute(time)])
    let full = true
    const dispatcher = new Dispatcher({
      ...parts,
      store: Object.assign(Object.create(store), {
        due: store.due.bind(store),
        retryAt: store.retryAt.bind(store),
        waitingAlerts: store.waitingAlerts.bind(store),
        hasten: store.hasten.bind(store),
        journal: store.journal.bind(store),
        settle: store.settle.bind(store),
        together: <T>(work: () => T): T => {
          if (full) throw new Error('disk full')
          return store.together(work)
        },
      }),
    })
    dispatcher.start()
    raise(raisedAndEnded()[0])
    await time.advance(20 * second)
    expect(store.waiting()).toBe(1)
    full = false
    await time.advance(minute)
    expect(store.waiting()).toBe(0)
    expect(new Set(routes[0]!.taken)).toEqual(new Set(['desk/3/1']))
    await dispatcher.stop()
  })

  test('a route that throws is a failed try', async () => {
    const { time, routes, store, dispatcher, raise } = house((time) => [new FakeRoute(time)])
    routes[0]!.answer = () => {
      throw new Error('a bug')
    }
    dispatcher.start()
    raise(raisedAndEnded()[0])
    await time.advance(10 * second)
    expect(store.waiting()).toBe(1)
    expect(store.due(time.now() + minute, 1)[0]).toMatchObject({ lastError: 'unexpected: a bug' })
    await dispatcher.stop()
  })

  test('stopping waits for what is in hand, takes nothing new and leaves no timer behind', async () => {
    const { time, routes, store, dispatcher, raise } = house((time) => [new FakeRoute(time)])
    let answerNow = () => {}
    routes[0]!.answer = () =>
      new Promise((resolve) => {
        answerNow = () => resolve(sent('taken'))
      })
    dispatcher.start()
    raise(...raisedAndEnded())
    await time.advance(0)
    const stopped = dispatcher.stop()
    answerNow()
    await stopped
    expect(routes[0]!.taken).toEqual(['desk/3/1'])
    expect(store.waiting()).toBe(1)
    expect(time.pending).toBe(0)
    dispatcher.poke()
    dispatcher.start()
    await time.advance(minute)
    expect(routes[0]!.tried).toHaveLength(1)
  })
})

/** What happens to one try. `lost` is taken by the route, but the monitor hears of a failure. */
const fates = ['taken', 'refused', 'down', 'lost', 'throws', 'crash'] as const

test('property: whatever fails and whenever the monitor crashes, each version arrives at least once and in order', async () => {
  await fc.assert(
    fc.asyncProperty(
      fc.array(fc.constantFrom(...fates), { maxLength: 40 }),
      fc.array(fc.constantFrom(0, 5, 60), { minLength: 3, maxLength: 3 }),
      fc.double({ min: 0, max: 0.999, noNaN: true }),
      async (plan, pauses, chance) => {
        const { time, routes, store, parts } = house(
          (time) => [new FakeRoute(time, 'hook'), new FakeRoute(time, 'on-call', { resendEveryMs: minute })],
          { random: () => chance },
        )
        const arrived: Record<string, string[]> = { hook: [], 'on-call': [] }
        let crashed = false
        for (const route of routes)
          route.answer = (what) => {
            const fate = what === 'repetition' ? 'taken' : (plan.shift() ?? 'taken')
            if (what !== 'repetition' && ['taken', 'lost'].includes(fate)) arrived[route.name]!.push(what)
            if (fate === 'throws') throw new Error('a bug')
            if (fate === 'crash') {
              crashed = true
              // The process is gone: nobody hears the answer.
              return new Promise(() => {})
            }
            if (fate === 'refused') return unsent('400', { routeWide: false })
            return fate === 'taken' ? sent('taken') : down()
          }
        let dispatcher = new Dispatcher(parts)
        dispatcher.start()
        const live = async (seconds: number) => {
          for (let s = 0; s < seconds; s += 5) {
            await time.advance(5 * second)
            if (!crashed) continue
            crashed = false
            // What the dead one still has in hand never comes back; its timer is taken away.
            void dispatcher.stop(0)
            dispatcher = new Dispatcher(parts)
            dispatcher.start()
          }
        }
        const versions = [...raisedAndEnded(), ...raisedAndEnded({}, 'plant')]
        const order = [versions[0]!, versions[2]!, versions[1]!, versions[3]!]
        for (const [i, alert] of order.entries()) {
          postAlerts(store, [alert], routes, time.now())
          dispatcher.poke()
          await live(pauses[i] ?? 0)
        }
        await live(45 * 60)
        expect(store.waiting()).toBe(0)
        for (const { name } of routes)
          for (const ensemble of ['desk', 'plant']) {
            const mine = arrived[name]!.filter((what) => what.startsWith(ensemble)).map((what) => what.at(-1))
            expect(mine.join('')).toMatch(/^1+2+$/)
          }
        void dispatcher.stop(0)
      },
    ),
    { seed: 11, numRuns: 40 },
  )
})
