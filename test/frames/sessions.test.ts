import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { type SessionChoice, Sessions } from '../../src/frames/sessions.ts'
import { Feeder, type Reading } from './feed.ts'

const oslo: SessionChoice = {
  zone: 'Europe/Oslo',
  open: '09:00',
  close: '16:20',
  days: 'mon-fri',
  holidays: [],
}
const utc = (text: string): number => Date.parse(text)
const everyDay = { days: 'mon-sun', holidays: [] }

/**
 * Change-overs, their instants from the law of each place and not from Intl: the European Union changes at
 * 01:00 UTC on the last Sundays of March and October (Directive 2000/84/EC; Norway follows it), the United
 * States at 02:00 local on the second Sunday of March and the first of November (Energy Policy Act of 2005),
 * Lord Howe Island by half an hour, UTC+10:30 and +11, at 02:00 local on the first Sundays of October and
 * April. Offsets at noon follow from these.
 */
const openings: readonly [zone: string, local: string, instant: string][] = [
  ['Europe/Oslo', '2026-03-28', '2026-03-28T08:00:00Z'],
  ['Europe/Oslo', '2026-03-29', '2026-03-29T07:00:00Z'],
  ['Europe/Oslo', '2026-10-24', '2026-10-24T07:00:00Z'],
  ['Europe/Oslo', '2026-10-25', '2026-10-25T08:00:00Z'],
  ['America/New_York', '2026-03-07', '2026-03-07T14:00:00Z'],
  ['America/New_York', '2026-03-08', '2026-03-08T13:00:00Z'],
  ['America/New_York', '2026-10-31', '2026-10-31T13:00:00Z'],
  ['America/New_York', '2026-11-01', '2026-11-01T14:00:00Z'],
  ['Australia/Lord_Howe', '2026-04-04', '2026-04-03T22:00:00Z'],
  ['Australia/Lord_Howe', '2026-04-05', '2026-04-04T22:30:00Z'],
  ['Australia/Lord_Howe', '2026-10-03', '2026-10-02T22:30:00Z'],
  ['Australia/Lord_Howe', '2026-10-04', '2026-10-03T22:00:00Z'],
]

describe('sessions', () => {
  test.each(openings)('in %s the session of %s opens at %s', (zone, _, instant) => {
    const sessions = new Sessions({ zone, open: '09:00', close: '16:20', ...everyDay })
    const opens = utc(instant)
    expect(sessions.at(opens - 1)).toBeNaN()
    expect(sessions.at(opens)).toBe(opens)
    expect(sessions.at(opens + 440 * 60_000 - 1)).toBe(opens)
    expect(sessions.at(opens + 440 * 60_000)).toBeNaN()
  })

  test('a session over a change-over is an hour, or half of one, shorter or longer', () => {
    const night = (zone: string): Sessions =>
      new Sessions({ zone, open: '22:00', close: '06:00', ...everyDay })
    const lasts = (sessions: Sessions, opens: number): number => {
      let minutes = 0
      while (sessions.at(opens + minutes * 60_000) === opens) minutes++
      return minutes
    }
    expect(lasts(night('Europe/Oslo'), utc('2026-03-28T21:00:00Z'))).toBe(7 * 60)
    expect(lasts(night('Europe/Oslo'), utc('2026-10-24T20:00:00Z'))).toBe(9 * 60)
    expect(lasts(night('America/New_York'), utc('2026-03-08T03:00:00Z'))).toBe(7 * 60)
    expect(lasts(night('America/New_York'), utc('2026-11-01T02:00:00Z'))).toBe(9 * 60)
    expect(lasts(night('Australia/Lord_Howe'), utc('2026-10-03T11:30:00Z'))).toBe(7.5 * 60)
    expect(lasts(night('Australia/Lord_Howe'), utc('2026-04-04T11:00:00Z'))).toBe(8.5 * 60)
  })

  test('a local time that is skipped opens at the end of the gap, one that comes twice at its first', () => {
    const at = { open: '02:30', close: '12:00', ...everyDay }
    const oslo = new Sessions({ zone: 'Europe/Oslo', ...at })
    expect(oslo.at(utc('2026-03-29T00:59:59Z'))).toBeNaN()
    expect(oslo.at(utc('2026-03-29T01:00:00Z'))).toBe(utc('2026-03-29T01:00:00Z'))
    expect(oslo.at(utc('2026-10-25T00:29:59Z'))).toBeNaN()
    expect(oslo.at(utc('2026-10-25T01:29:00Z'))).toBe(utc('2026-10-25T00:30:00Z'))
  })

  test('an overnight session belongs to the day on which it opens', () => {
    const sessions = new Sessions({
      zone: 'America/New_York',
      open: '18:00',
      close: '17:00',
      days: 'sun-thu',
      holidays: ['2026-07-05'],
    })
    // Friday 2026-07-10 16:00 is in Thursday's session; Friday evening and Saturday are closed.
    expect(sessions.at(utc('2026-07-10T20:00:00Z'))).toBe(utc('2026-07-09T22:00:00Z'))
    expect(sessions.at(utc('2026-07-10T23:00:00Z'))).toBeNaN()
    expect(sessions.at(utc('2026-07-11T20:00:00Z'))).toBeNaN()
    expect(sessions.at(utc('2026-07-12T22:00:00Z'))).toBe(utc('2026-07-12T22:00:00Z'))
    // Sunday the 5th is a holiday: nothing opens until Monday evening.
    expect(sessions.at(utc('2026-07-06T12:00:00Z'))).toBeNaN()
    expect(sessions.at(utc('2026-07-06T22:00:00Z'))).toBe(utc('2026-07-06T22:00:00Z'))
  })

  // 2026-06-01 is a Monday; the week from it, each day open or closed at noon.
  test.each([
    ['mon-sun', 'mon tue wed thu fri sat sun'],
    ['mon-fri', 'mon tue wed thu fri'],
    ['fri-mon', 'mon fri sat sun'],
    ['sat-tue,thu', 'mon tue thu sat sun'],
    ['mon, wed, fri', 'mon wed fri'],
    ['Sun', 'sun'],
    ['wed-wed', 'wed'],
  ])('"%s" opens on %s', (days, open) => {
    const sessions = new Sessions({ ...oslo, days })
    const week = ['mon', 'tue', 'wed', 'thu', 'fri', 'sat', 'sun']
    const noon = (d: number): number => utc('2026-06-01T10:00:00Z') + d * 86_400_000
    expect(week.filter((_, d) => !Number.isNaN(sessions.at(noon(d)))).join(' ')).toBe(open)
  })

  test.each(['', 'day', 'mon-', 'mon-fry', 'mon,,tue'])('"%s" is no list of days', (days) => {
    expect(() => new Sessions({ ...oslo, days })).toThrow(RangeError)
  })

  test('a span of days lies in a session only as a whole', () => {
    const sessions = new Sessions(oslo)
    const opens = utc('2026-06-01T07:00:00Z')
    const closes = utc('2026-06-01T14:20:00Z')
    expect(sessions.covers(opens, closes)).toBe(true)
    expect(sessions.covers(opens - 1, closes)).toBe(false)
    expect(sessions.covers(opens, closes + 1)).toBe(false)
    expect(sessions.covers(opens, closes + 86_400_000)).toBe(false)
  })

  test('weekends and holidays are closed, and times before 1970 are no worse than others', () => {
    const sessions = new Sessions({ ...oslo, holidays: ['2026-05-01'] })
    expect(sessions.at(utc('2026-05-01T10:00:00Z'))).toBeNaN()
    expect(sessions.at(utc('2026-05-02T10:00:00Z'))).toBeNaN()
    expect(sessions.at(utc('2026-05-04T10:00:00Z'))).toBe(utc('2026-05-04T07:00:00Z'))
    expect(sessions.at(utc('1968-02-05T10:00:00Z'))).toBe(utc('1968-02-05T08:00:00Z'))
  })

  test('what is remembered never changes the answer', () => {
    const zones = ['Europe/Oslo', 'America/New_York', 'Australia/Lord_Howe']
    const instant = fc.integer({ min: utc('2026-01-01'), max: utc('2027-01-01') })
    fc.assert(
      fc.property(
        fc.constantFrom(...zones),
        fc.constantFrom(['09:00', '16:20'], ['22:00', '05:00'], ['18:00', '18:00']),
        fc.array(instant, { minLength: 1, maxLength: 40 }),
        (zone, [open, close], times) => {
          const choice = { zone, open: open!, close: close!, days: 'mon-fri', holidays: ['2026-07-08'] }
          const used = new Sessions(choice)
          for (const time of times) expect(used.at(time)).toBe(new Sessions(choice).at(time))
        },
      ),
      { numRuns: 40, seed: 11 },
    )
  })

  test.each(['9:00', '24:00', '12:60', ''])('"%s" is no time of day', (open) => {
    expect(() => new Sessions({ ...oslo, open })).toThrow(RangeError)
  })
})

describe('frames and sessions', () => {
  const second = 1000
  const every = (from: string, seconds: number, level: number): Reading[] =>
    Array.from({ length: seconds }, (_, k): Reading => ['a', utc(from) + k * second, level + k])

  test('no increment is taken across a closed market, and readings outside are counted', () => {
    const feeder = new Feeder({ sessions: oslo, staleAfter: 10 * 86_400_000 })
      .take([
        ['a', utc('2026-03-27T07:59:59Z'), 1],
        ...every('2026-03-27T15:19:57Z', 3, 100),
        ['a', utc('2026-03-27T15:20:00Z'), 5],
        ['a', utc('2026-03-28T10:00:00Z'), 6],
        // Monday after the change-over: an hour earlier by UTC.
        ...every('2026-03-30T07:00:00Z', 3, 900),
      ])
      .end()
    expect(feeder.dropped).toEqual({ closed: 3 })
    expect(feeder.table).toEqual([
      { time: utc('2026-03-27T15:19:59Z'), increments: { a: 1 } },
      { time: utc('2026-03-27T15:20:00Z'), increments: { a: 1 } },
      { time: utc('2026-03-30T07:00:02Z'), increments: { a: 1 } },
      { time: utc('2026-03-30T07:00:03Z'), increments: { a: 1 } },
    ])
    expect(feeder.findings).toEqual([])
  })

  test('a last step that the close cuts short still belongs to its session', () => {
    const feeder = new Feeder({ step: 7000, sessions: oslo }).take(every('2026-03-27T15:19:40Z', 20, 1)).end()
    const end = Math.ceil(utc('2026-03-27T15:20:00Z') / 7000) * 7000
    expect(feeder.table.at(-1)?.time).toBe(end)
    expect(feeder.table.at(-1)?.increments.a).toBeGreaterThan(0)
  })

  test('a silence within a session is a gap, the night is none', () => {
    const feeder = new Feeder({ sessions: oslo })
      .take([
        ...every('2026-03-26T10:00:00Z', 3, 1),
        ...every('2026-03-26T11:00:00Z', 3, 1),
        ...every('2026-03-27T10:00:00Z', 3, 1),
      ])
      .end()
    expect(feeder.findings.filter(({ finding }) => finding === 'gap')).toEqual([
      expect.objectContaining({ from: utc('2026-03-26T10:00:14Z'), to: utc('2026-03-26T11:00:00Z') }),
    ])
  })
})
