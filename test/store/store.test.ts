import { describe, expect, test } from 'vitest'
import { openStore } from '../../src/store/open-store.ts'
import type { Delivery, JournalEntry } from '../../src/store/store.ts'

const delivery = (route: string, alert: string, version: number, over: Partial<Delivery> = {}): Delivery => ({
  key: `${route}/${alert}/${version}`,
  route,
  alert,
  version,
  payload: { alert, version },
  created: 1000 + version,
  attempts: 0,
  notBefore: 0,
  giveUpAt: 1e9,
  lastError: null,
  ...over,
})

const keys = (deliveries: readonly Delivery[]) => deliveries.map(({ key }) => key)

describe('checkpoint', () => {
  test('there is none at first; the last one saved is given back bit for bit', () => {
    const store = openStore(':memory:')
    expect(store.loadCheckpoint()).toBeNull()
    const checkpoint = {
      version: 1,
      savedAt: 1_764_590_000_000.5,
      positions: { ticks: { 'ticks-0': '9223372036854775807' } },
      ensembles: {
        desk: {
          moments: Float64Array.of(0.1, -0, Number.NaN, Number.POSITIVE_INFINITY, 5e-324),
          flags: Uint8Array.of(1, 0, 255),
          names: new Map([['QUAY', 3n]]),
        },
      },
    }
    store.saveCheckpoint({ ...checkpoint, version: 0 })
    store.saveCheckpoint(checkpoint)
    expect(store.loadCheckpoint()).toStrictEqual(checkpoint)
  })

  test('a view into a larger array keeps only its own part', () => {
    const store = openStore(':memory:')
    const view = new Float64Array(1_000_000).subarray(10, 12).fill(7)
    store.saveCheckpoint({ version: 1, savedAt: 0, positions: {}, ensembles: { desk: view } })
    expect(store.loadCheckpoint()?.ensembles.desk).toStrictEqual(Float64Array.of(7, 7))
  })
})

describe('outbox', () => {
  test('only the oldest version of an alert is due on a route, also while it waits for its next attempt', () => {
    const store = openStore(':memory:')
    store.enqueue([delivery('hook', 'a', 2), delivery('hook', 'a', 1), delivery('hook', 'b', 1)])
    expect(keys(store.due(10, 10)).sort()).toEqual(['hook/a/1', 'hook/b/1'])
    store.retryAt('hook/a/1', 1, 500, 'refused')
    expect(keys(store.due(499, 10))).toEqual(['hook/b/1'])
    expect(store.due(500, 10).find(({ alert }) => alert === 'a')).toEqual(
      delivery('hook', 'a', 1, { attempts: 1, notBefore: 500, lastError: 'refused' }),
    )
    store.settle('hook/a/1', 'delivered')
    expect(keys(store.due(500, 10)).sort()).toEqual(['hook/a/2', 'hook/b/1'])
  })

  test('a route with much that waits leaves room for the others', () => {
    const store = openStore(':memory:')
    store.enqueue(Array.from({ length: 500 }, (_, i) => delivery('down', `old-${i}`, 1, { created: i })))
    store.enqueue([delivery('up', 'new', 1, { created: 9999 })])
    expect(keys(store.due(10, 4))).toContain('up/new/1')
    expect(store.due(10, 4)).toHaveLength(4)
  })

  test('the same key replaces a delivery that was not tried, and leaves one that was', () => {
    const store = openStore(':memory:')
    store.enqueue([delivery('hook', 'a', 1, { payload: 'first' })])
    store.enqueue([delivery('hook', 'a', 1, { payload: 'second' })])
    expect(store.due(10, 10).map(({ payload }) => payload)).toEqual(['second'])
    store.retryAt('hook/a/1', 1, 0, 'refused')
    store.enqueue([delivery('hook', 'a', 1, { payload: 'third' })])
    expect(store.due(10, 10).map(({ payload, attempts }) => [payload, attempts])).toEqual([['second', 1]])
    expect(store.waiting()).toBe(1)
  })

  test('it counts what waits, names the alerts that wait for a route, and makes them due at once on request', () => {
    const store = openStore(':memory:')
    store.enqueue([
      delivery('hook', 'a', 1, { notBefore: 900 }),
      delivery('hook', 'a', 2),
      delivery('topic', 'b', 1),
    ])
    expect(store.waiting()).toBe(3)
    expect(store.waitingAlerts('hook')).toEqual(new Set(['a']))
    expect(store.waitingAlerts('log')).toEqual(new Set())
    expect(keys(store.due(10, 10))).toEqual(['topic/b/1'])
    store.hasten(10)
    expect(keys(store.due(10, 10)).sort()).toEqual(['hook/a/1', 'topic/b/1'])
    store.settle('hook/a/1', 'given-up')
    store.settle('hook/a/1', 'given-up')
    expect(store.waiting()).toBe(2)
  })
})

describe('journal', () => {
  const entry = (time: number, kind: JournalEntry['kind'], ensemble: string | null): JournalEntry => ({
    time,
    kind,
    ensemble,
    body: { n: time },
  })

  test('gives the newest entries that pass the filter, oldest first', () => {
    const store = openStore(':memory:')
    store.journal([entry(1, 'shift', 'desk'), entry(2, 'ended', 'desk'), entry(3, 'shift', 'plant')])
    store.journal([entry(4, 'shift', 'desk'), entry(5, 'run', null)])
    const times = (filter: Parameters<typeof store.readJournal>[0]) =>
      store.readJournal(filter).map(({ time }) => time)
    expect(times({})).toEqual([1, 2, 3, 4, 5])
    expect(times({ limit: 2 })).toEqual([4, 5])
    expect(times({ ensemble: 'desk', kind: 'shift' })).toEqual([1, 4])
    expect(times({ kind: 'shift', limit: 2 })).toEqual([3, 4])
    expect(store.readJournal({ kind: 'run' })).toEqual([entry(5, 'run', null)])
  })

  test('only the oldest of the kinds delivery and run give way', () => {
    const store = openStore(':memory:', { prunableEntries: 3 })
    for (let i = 0; i < 20; i++)
      store.journal([entry(i, i % 2 ? 'run' : 'delivery', null), entry(i, 'shift', 'desk')])
    expect(store.readJournal({ kind: 'shift' })).toHaveLength(20)
    const kept = [...store.readJournal({ kind: 'run' }), ...store.readJournal({ kind: 'delivery' })]
    expect(kept.map(({ time }) => time).sort()).toEqual([17, 18, 19])
  })
})

describe('alerts', () => {
  test('the last version saved is the present one; those saved last come first', () => {
    const store = openStore(':memory:')
    store.saveAlert('a', { version: 1, ended: null })
    store.saveAlert('b', { version: 1, ended: null })
    store.saveAlert('a', { version: 2, ended: 5 })
    expect(store.alert('a')).toEqual({ version: 2, ended: 5 })
    expect(store.alert('c')).toBeNull()
    expect(store.alerts(10)).toEqual([
      { version: 2, ended: 5 },
      { version: 1, ended: null },
    ])
    expect(store.alerts(1)).toHaveLength(1)
  })

  test('ended alerts give way to newer ones, an alert that has not ended stays however old', () => {
    const store = openStore(':memory:', { endedAlerts: 3 })
    store.saveAlert('lasting', { id: 'lasting', ended: null })
    for (let i = 0; i < 10; i++) store.saveAlert(`e${i}`, { id: `e${i}`, ended: i })
    expect(store.alerts(100).map((alert) => (alert as { id: string }).id)).toEqual([
      'e9',
      'e8',
      'e7',
      'lasting',
    ])
  })
})

test('the quarantine keeps the newest records up to its bound', () => {
  const store = openStore(':memory:', { quarantine: 3 })
  store.quarantine([{ n: 1 }, { n: 2 }])
  store.quarantine([{ n: 3 }, { n: 4 }])
  expect(store.readQuarantine(10)).toEqual([{ n: 4 }, { n: 3 }, { n: 2 }])
  store.quarantine(Array.from({ length: 50 }, (_, i) => ({ n: i })))
  expect(store.readQuarantine(10)).toEqual([{ n: 49 }, { n: 48 }, { n: 47 }])
  expect(store.readQuarantine(1)).toEqual([{ n: 49 }])
})

describe('together', () => {
  test('writes all or nothing, also when methods that write several rows are called inside', () => {
    const store = openStore(':memory:')
    const writeAll = () => {
      store.enqueue([delivery('hook', 'a', 1)])
      store.saveAlert('a', { ended: null })
      store.journal([{ time: 1, kind: 'shift', ensemble: 'desk', body: null }])
      store.quarantine(['bad'])
      store.saveCheckpoint({ version: 1, savedAt: 0, positions: {}, ensembles: {} })
    }
    const contents = () => [
      store.waiting(),
      store.alerts(9).length,
      store.readJournal({}).length,
      store.readQuarantine(9).length,
      store.loadCheckpoint() === null ? 0 : 1,
    ]
    expect(() =>
      store.together(() => {
        writeAll()
        throw new Error('in the middle')
      }),
    ).toThrow('in the middle')
    expect(contents()).toEqual([0, 0, 0, 0, 0])
    const result = store.together(() => {
      writeAll()
      return 'result'
    })
    expect(result).toBe('result')
    expect(contents()).toEqual([1, 1, 1, 1, 1])
  })
})

test('a closed store refuses work, and may be closed again', () => {
  const store = openStore(':memory:')
  store.close()
  store.close()
  expect(() => store.waiting()).toThrow('closed')
})
