import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import type { Act, AlertEvent } from '../../src/alerts/alert.ts'
import { cautions } from '../../src/alerts/wording.ts'
import { at, book, shiftEvent, steadyEvent } from './support/shifts.ts'

const alice = { by: 'alice' }
const id = 'desk/3/2026-11-02T10:39:50Z'

describe('events', () => {
  test('a shift raises one alert with its id, links, sentence, details and cautions', () => {
    const [alert, ...others] = book().take(shiftEvent())
    expect(others).toEqual([])
    expect(alert).toMatchObject({
      id,
      version: 1,
      ensemble: 'desk',
      state: 'unacknowledged',
      ended: null,
      trial: false,
      runbook: 'https://runbooks.example/desk',
      page: 'https://monitor.example:8450/?ensemble=desk',
      raised: at('10:42:07'),
      change: { what: 'confirmed', at: at('10:42:07') },
      cautions,
    })
    expect(alert!.sentence).toContain('more strongly')
    expect(alert!.details).toHaveLength(8)
  })

  test('steady ends it as a new version of the same alert', () => {
    const alerts = book()
    const [raised] = alerts.take(shiftEvent())
    const [ended] = alerts.take(steadyEvent())
    expect(ended).toMatchObject({
      id: raised!.id,
      version: 2,
      state: 'returned-to-normal',
      ended: at('11:30:00'),
      change: { what: 'ended', at: at('11:30:02') },
    })
    expect(ended!.sentence).toContain('steady again since 2026-11-02T11:30:00Z')
  })

  test('the same event twice changes nothing', () => {
    const alerts = book()
    alerts.take(shiftEvent())
    expect(alerts.take(shiftEvent({}, { now: at('10:50:00') }))).toEqual([])
    alerts.take(steadyEvent())
    expect(alerts.take(steadyEvent(3, at('12:00:00')))).toEqual([])
    expect(alerts.take(shiftEvent())).toEqual([])
    expect(alerts.all()).toHaveLength(1)
  })

  test('a new shift ends the alert of the one before, also when numbers start again; other ensembles stay', () => {
    const alerts = book()
    alerts.take(shiftEvent({ number: 7 }))
    alerts.take(shiftEvent({ number: 7 }, { ensemble: 'plant' }))
    const versions = alerts.take(shiftEvent({ number: 1, start: at('12:00:00'), confirmed: at('12:03:00') }))
    expect(versions.map(({ id, version, ended }) => [id, version, ended])).toEqual([
      ['desk/7/2026-11-02T10:39:50Z', 2, at('12:03:00')],
      ['desk/1/2026-11-02T12:00:00Z', 1, null],
    ])
    expect(alerts.all().find(({ ensemble }) => ensemble === 'plant')?.ended).toBeNull()
  })

  test('steady speaks of shifts up to its number only', () => {
    const alerts = book()
    alerts.take(shiftEvent({ number: 3 }))
    expect(alerts.take(steadyEvent(2))).toEqual([])
    expect(alerts.take(steadyEvent(4))).toHaveLength(1)
  })

  test('a trial is over as soon as it is raised, is marked, and does not stand', () => {
    const alerts = book()
    const [trial] = alerts.take({ type: 'trial', now: at('09:00:00') })
    expect(trial).toMatchObject({ trial: true, ended: at('09:00:00'), shift: null })
    expect(trial!.sentence).toMatch(/^Trial: /)
    expect(alerts.standing(at('09:00:01'))).toEqual([])
    expect(alerts.take({ type: 'trial', now: at('09:00:00') })).toEqual([])
  })

  test('an alert stands until five minutes after its end', () => {
    const alerts = book()
    alerts.take(shiftEvent())
    alerts.take(steadyEvent())
    expect(alerts.standing(at('11:35:01'))).toHaveLength(1)
    expect(alerts.standing(at('11:35:03'))).toHaveLength(0)
  })
})

describe('acts', () => {
  const raised = () => {
    const alerts = book()
    alerts.take(shiftEvent())
    return alerts
  }
  const code = (result: ReturnType<ReturnType<typeof book>['act']>) => (result.ok ? null : result.error.code)
  const shelve: Act = { type: 'shelve', ...alice, reason: 'pump test', until: at('12:00:00') }

  test('acknowledging notes who and when, once', () => {
    const alerts = raised()
    const first = alerts.act(id, { type: 'acknowledge', ...alice }, at('10:45:00'))
    expect(first).toMatchObject({
      ok: true,
      value: { version: 2, state: 'acknowledged', acknowledged: { by: 'alice', at: at('10:45:00') } },
    })
    expect(alerts.act(id, { type: 'acknowledge', by: 'bob' }, at('10:46:00'))).toEqual({
      ok: true,
      value: null,
    })
    expect(alerts.all()[0]!.acknowledged).toEqual({ by: 'alice', at: at('10:45:00') })
  })

  test('an alert that has returned to normal may still be acknowledged and stays returned', () => {
    const alerts = raised()
    alerts.take(steadyEvent())
    const result = alerts.act(id, { type: 'acknowledge', ...alice }, at('11:40:00'))
    expect(result).toMatchObject({ ok: true, value: { state: 'returned-to-normal', version: 3 } })
  })

  test('shelving ends by itself and gives back the state before', () => {
    const alerts = raised()
    alerts.act(id, { type: 'acknowledge', ...alice }, at('10:45:00'))
    expect(alerts.act(id, shelve, at('10:50:00'))).toMatchObject({
      ok: true,
      value: { state: 'shelved', withheld: { reason: 'pump test', until: at('12:00:00') } },
    })
    expect(alerts.wake(at('11:59:59'))).toEqual([])
    expect(alerts.wake(at('12:00:00'))).toMatchObject([
      {
        state: 'acknowledged',
        version: 4,
        withheld: null,
        change: { what: 'returned-to-service', by: null },
      },
    ])
    expect(alerts.wake(at('12:00:01'))).toEqual([])
  })

  test('suppression and out of service last until the return to service', () => {
    for (const [act, state] of [
      [{ type: 'suppress', ...alice, reason: 'start-up' }, 'suppressed-by-design'],
      [{ type: 'take-out-of-service', ...alice, reason: 'calibration' }, 'out-of-service'],
    ] as const) {
      const alerts = raised()
      expect(alerts.act(id, act, at('10:50:00'))).toMatchObject({ ok: true, value: { state } })
      expect(alerts.wake(at('23:00:00'))).toEqual([])
      expect(code(alerts.act(id, { type: 'acknowledge', ...alice }, at('10:51:00')))).toBe('act-refused')
      expect(alerts.act(id, { type: 'return-to-service', by: 'bob' }, at('11:00:00'))).toMatchObject({
        ok: true,
        value: { state: 'unacknowledged', change: { by: 'bob' } },
      })
    }
  })

  test('refused: unknown alert, no reason, an end that has passed, an alert that has ended', () => {
    const alerts = raised()
    const now = at('10:50:00')
    expect(code(alerts.act('desk/9/x', shelve, now))).toBe('alert-unknown')
    expect(code(alerts.act(id, { ...shelve, reason: ' ' }, now))).toBe('act-refused')
    expect(code(alerts.act(id, { ...shelve, until: now }, now))).toBe('act-refused')
    expect(code(alerts.act(id, { ...shelve, until: Number.NaN }, now))).toBe('act-refused')
    alerts.take(steadyEvent())
    expect(code(alerts.act(id, shelve, now))).toBe('act-refused')
  })

  test('the end of the regime ends a withheld alert too', () => {
    const alerts = raised()
    alerts.act(id, shelve, at('10:50:00'))
    expect(alerts.take(steadyEvent())).toMatchObject([{ state: 'returned-to-normal', withheld: null }])
    expect(alerts.wake(at('23:00:00'))).toEqual([])
  })
})

describe('memory', () => {
  const anyEvent = fc
    .record({
      ensemble: fc.constantFrom('desk', 'plant'),
      number: fc.integer({ min: 1, max: 4 }),
      steady: fc.boolean(),
    })
    .map(({ ensemble, number, steady }): AlertEvent => {
      const now = at('10:00:00') + number * 600_000
      return steady
        ? steadyEvent(number, now + 300_000, ensemble)
        : shiftEvent({ number, start: now, confirmed: now + 1000 }, { ensemble, now: now + 2000 })
    })

  /** Events come in the order of their times, some of them twice, some not at all. */
  const history = fc
    .array(anyEvent, { maxLength: 20 })
    .map((events) => events.toSorted((a, b) => a.now - b.now))

  test('property: replaying any past events after a restore changes nothing', () => {
    fc.assert(
      fc.property(history, (events) => {
        const first = book()
        for (const event of events) first.take(event)
        const second = book()
        second.restore(structuredClone(first.snapshot()))
        const before = JSON.stringify(second.all())
        for (const event of events) expect(second.take(event)).toEqual([])
        expect(JSON.stringify(second.all())).toBe(before)
      }),
      { seed: 7, numRuns: 300 },
    )
  })

  test('property: every alert has versions 1, 2, 3 … and at most one open alert an ensemble', () => {
    fc.assert(
      fc.property(fc.array(anyEvent, { maxLength: 20 }), (events) => {
        const alerts = book()
        const seen = new Map<string, number>()
        for (const event of events)
          for (const alert of alerts.take(event)) {
            expect(alert.version).toBe((seen.get(alert.id) ?? 0) + 1)
            seen.set(alert.id, alert.version)
          }
        for (const ensemble of ['desk', 'plant'])
          expect(
            alerts.all().filter((alert) => alert.ensemble === ensemble && alert.ended === null).length,
          ).toBeLessThanOrEqual(1)
      }),
      { seed: 8, numRuns: 300 },
    )
  })

  test('the oldest ended alerts are forgotten, open ones are not', () => {
    const alerts = book(5)
    alerts.take(shiftEvent({ number: 1 }, { ensemble: 'plant' }))
    for (let n = 1; n <= 50; n++) alerts.take(shiftEvent({ number: n, start: at('10:00:00') + n * 1000 }))
    expect(alerts.all().map(({ id }) => id.split('/').slice(0, 2).join('/'))).toEqual([
      'desk/50',
      'desk/49',
      'desk/48',
      'desk/47',
      'desk/46',
      'desk/45',
      'plant/1',
    ])
  })
})
