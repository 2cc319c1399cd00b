const dayMs = 86_400_000
const hourMs = 3_600_000
const weekdays = ['sun', 'mon', 'tue', 'wed', 'thu', 'fri', 'sat'] as const

export interface SessionChoice {
  /** IANA time zone. */
  readonly zone: string
  /** Local times of day, HH:MM. A close at or before the open lies on the next day. */
  readonly open: string
  readonly close: string
  /** `mon-fri` or `mon,wed,fri`; of the day on which the session opens. */
  readonly days: string
  /** Local dates, YYYY-MM-DD, on which no session opens. */
  readonly holidays: readonly string[]
}

/** A stretch of time [from, until) in one session, named by its opening instant, or in none: NaN. */
interface Interval {
  readonly from: number
  readonly until: number
  readonly session: number
}

/** Days whose sessions are remembered. */
const mostSpans = 64

/**
 * Trading sessions of a market by its local clock, as instants: daylight saving is in the time zone's own
 * rules (Intl). A local time that a change-over skips counts as the first instant after the gap; one that it
 * repeats counts as the first of the two.
 */
export class Sessions {
  readonly #open: number
  readonly #close: number
  readonly #days: ReadonlySet<number>
  readonly #holidays: ReadonlySet<string>
  readonly #format: Intl.DateTimeFormat
  /** Opening and closing instants by local day, or null where no session opens. */
  readonly #spans = new Map<number, readonly [opens: number, closes: number] | null>()
  #now: Interval = { from: 0, until: 0, session: Number.NaN }
  #before: Interval = { from: 0, until: 0, session: Number.NaN }

  /** @throws RangeError on an unknown time zone, time or day */
  constructor({ zone, open, close, days, holidays }: SessionChoice) {
    this.#format = new Intl.DateTimeFormat('en-GB', {
      timeZone: zone,
      hourCycle: 'h23',
      year: 'numeric',
      month: 'numeric',
      day: 'numeric',
      hour: 'numeric',
      minute: 'numeric',
      second: 'numeric',
    })
    this.#open = timeOfDay(open)
    this.#close = timeOfDay(close)
    this.#days = daysOfWeek(days)
    this.#holidays = new Set(holidays)
  }

  /** Opening instant of the session that `time` lies in, or NaN while the market is closed. */
  at(time: number): number {
    return this.#interval(time).session
  }

  /** Does the whole span [from, until) lie in one session? */
  covers(from: number, until: number): boolean {
    const interval = this.#interval(from)
    return !Number.isNaN(interval.session) && interval.until >= until
  }

  #interval(time: number): Interval {
    if (time >= this.#now.from && time < this.#now.until) return this.#now
    const before = this.#before
    this.#before = this.#now
    this.#now = time >= before.from && time < before.until ? before : this.#locate(time)
    return this.#now
  }

  /** The session around `time`; or as much of the closed time around it as the days near by tell of. */
  #locate(time: number): Interval {
    const today = Math.floor(this.#local(time) / dayMs) * dayMs
    let from = time - dayMs / 2
    let until = time + dayMs / 2
    for (let day = today - 2 * dayMs; day <= today + 2 * dayMs; day += dayMs) {
      const span = this.#span(day)
      if (span === null) continue
      const [opens, closes] = span
      if (time >= opens && time < closes) return { from: opens, until: closes, session: opens }
      if (closes <= time) from = Math.max(from, closes)
      if (opens > time) until = Math.min(until, opens)
    }
    return { from, until, session: Number.NaN }
  }

  #span(day: number): readonly [opens: number, closes: number] | null {
    const known = this.#spans.get(day)
    if (known !== undefined) return known
    if (this.#spans.size >= mostSpans) this.#spans.clear()
    const closingDay = this.#close <= this.#open ? day + dayMs : day
    const span = this.#opensOn(day)
      ? ([this.#instant(day + this.#open), this.#instant(closingDay + this.#close)] as const)
      : null
    this.#spans.set(day, span)
    return span
  }

  #opensOn(day: number): boolean {
    const date = new Date(day)
    return this.#days.has(date.getUTCDay()) && !this.#holidays.has(date.toISOString().slice(0, 10))
  }

  /** The local wall clock at an instant, written as if it were UTC. */
  #local(time: number): number {
    const field: Record<string, number> = {}
    for (const { type, value } of this.#format.formatToParts(time)) field[type] = Number(value)
    const { year = 0, month = 1, day = 1, hour = 0, minute = 0, second = 0 } = field
    return Date.UTC(year, month - 1, day, hour, minute, second)
  }

  #instant(local: number): number {
    const offsetAt = (time: number): number => this.#local(time) - time
    const before = local - offsetAt(local - dayMs)
    const after = local - offsetAt(local + dayMs)
    const fits = [before, after].filter((time) => this.#local(time) === local)
    if (fits.length > 0) return Math.min(...fits)
    // The wall clock skips this time: the first instant after the gap.
    let low = Math.min(before, after)
    let high = Math.max(before, after)
    while (high - low > 1000) {
      const middle = Math.floor((low + high) / 2000) * 1000
      if (this.#local(middle) > local) high = middle
      else low = middle
    }
    return high
  }
}

function timeOfDay(text: string): number {
  const match = /^([01]\d|2[0-3]):([0-5]\d)$/.exec(text)
  if (match === null) throw new RangeError(`"${text}" is no time of day`)
  return Number(match[1]) * hourMs + Number(match[2]) * 60_000
}

export function daysOfWeek(text: string): ReadonlySet<number> {
  const numberOf = (name: string): number => {
    const day = weekdays.indexOf(name.trim() as (typeof weekdays)[number])
    if (day < 0) throw new RangeError(`"${name}" is no day of the week`)
    return day
  }
  const days = new Set<number>()
  for (const part of text.toLowerCase().split(',')) {
    const [from = '', to] = part.split('-')
    const first = numberOf(from)
    const last = to === undefined ? first : numberOf(to)
    for (let day = first; ; day = (day + 1) % 7) {
      days.add(day)
      if (day === last) break
    }
  }
  return days
}
