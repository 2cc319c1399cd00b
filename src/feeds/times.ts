import { latin1 } from './decimal.ts'

export type TimeUnit = 'rfc3339' | 's' | 'ms' | 'us' | 'ns'

/** Event times outside of the years 1900 to 2200 are no event times: `bad-time`. Milliseconds since 1970 UTC. */
export const earliestTime = Date.UTC(1900, 0, 1)
export const latestTime = Date.UTC(2201, 0, 1)

/** The time itself, or NaN where it lies outside of the years 1900 to 2200. */
export const inRange = (time: number): number =>
  time >= earliestTime && time < latestTime ? time : Number.NaN

const dayMs = 86_400_000
/** No text longer than this is taken for a time. */
export const longestTime = 80
/** Days before the first of each month in a common year. */
const daysBefore = [0, 31, 59, 90, 120, 151, 181, 212, 243, 273, 304, 334, 365]

const isLeap = (year: number): boolean => year % 4 === 0 && (year % 100 !== 0 || year % 400 === 0)

/** Two decimal digits at `at`, or NaN. */
function pair(bytes: Uint8Array, at: number): number {
  const tens = bytes[at]! - 48
  const ones = bytes[at + 1]! - 48
  return tens >= 0 && tens <= 9 && ones >= 0 && ones <= 9 ? 10 * tens + ones : Number.NaN
}

/** Days since 1970-01-01 in the Gregorian calendar, or NaN where there is no such day. */
function dayNumber(year: number, month: number, day: number): number {
  if (!(month >= 1 && month <= 12 && day >= 1)) return Number.NaN
  const leapDay = isLeap(year) ? 1 : 0
  const inMonth = daysBefore[month]! - daysBefore[month - 1]! + (month === 2 ? leapDay : 0)
  if (day > inMonth) return Number.NaN
  const past = year - 1
  const days = 365 * past + Math.floor(past / 4) - Math.floor(past / 100) + Math.floor(past / 400)
  return days + daysBefore[month - 1]! + (month > 2 ? leapDay : 0) + day - 719_163
}

/**
 * Milliseconds since 1970 UTC of an RFC 3339 time in `bytes[from, to)`; NaN where it is none or lies outside
 * of the years 1900 to 2200. Beyond RFC 3339 are taken: a date alone (midnight UTC), a blank for the T (which
 * RFC 3339 leaves to agreement), and a time without offset (UTC). Second 60 is the second after 59, as in
 * POSIX time. Fractions are read to 15 places, further ones are ignored.
 */
export function readRfc3339(bytes: Uint8Array, from: number, to: number): number {
  if (to - from < 10 || to - from > longestTime || bytes[from + 4] !== 45 || bytes[from + 7] !== 45)
    return Number.NaN
  const year = 100 * pair(bytes, from) + pair(bytes, from + 2)
  const days = dayNumber(year, pair(bytes, from + 5), pair(bytes, from + 8))
  if (to - from === 10) return inRange(days * dayMs)
  const separator = bytes[from + 10]
  if (separator !== 84 && separator !== 116 && separator !== 32) return Number.NaN
  if (to - from < 19 || bytes[from + 13] !== 58 || bytes[from + 16] !== 58) return Number.NaN
  const hour = pair(bytes, from + 11)
  const minute = pair(bytes, from + 14)
  const second = pair(bytes, from + 17)
  if (!(hour < 24 && minute < 60 && second <= 60)) return Number.NaN
  let p = from + 19
  let fraction = 0
  if (p < to && bytes[p] === 46) {
    const first = ++p
    let scale = 1
    while (p < to && bytes[p]! >= 48 && bytes[p]! <= 57) {
      if (p - first < 15) {
        fraction = 10 * fraction + bytes[p]! - 48
        scale *= 10
      }
      p++
    }
    if (p === first) return Number.NaN
    fraction = scale === 1000 ? fraction : (1000 * fraction) / scale
  }
  const offset = readOffset(bytes, p, to)
  return inRange(days * dayMs + ((hour * 60 + minute - offset) * 60 + second) * 1000 + fraction)
}

/** Minutes east of UTC. */
function readOffset(bytes: Uint8Array, from: number, to: number): number {
  if (from === to) return 0
  const sign = bytes[from]
  if (sign === 90 || sign === 122) return from + 1 === to ? 0 : Number.NaN
  if ((sign !== 43 && sign !== 45) || to - from !== 6 || bytes[from + 3] !== 58) return Number.NaN
  const hours = pair(bytes, from + 1)
  const minutes = pair(bytes, from + 4)
  if (!(hours < 24 && minutes < 60)) return Number.NaN
  return sign === 43 ? 60 * hours + minutes : -(60 * hours + minutes)
}

const exponents = { s: 'e3', ms: '', us: 'e-3', ns: 'e-6' } as const
const plainDecimal = /^-?[0-9]{1,40}(?:\.[0-9]{1,40})?$/

/**
 * Milliseconds of an epoch time given as a number; NaN outside of the years 1900 to 2200. Seconds are taken
 * to the microsecond, which is what a double of today's seconds can carry.
 */
export function epochNumber(number: number, unit: Exclude<TimeUnit, 'rfc3339'>): number {
  switch (unit) {
    case 'ms':
      return inRange(number)
    case 's':
      return inRange(Math.round(number * 1e6) / 1e3)
    case 'us':
      return inRange(number / 1e3)
    case 'ns':
      return inRange(number / 1e6)
  }
}

/** As `epochNumber`, of a plain decimal text and rounded only once, however many digits it has. */
export function epochText(text: string, unit: Exclude<TimeUnit, 'rfc3339'>): number {
  return plainDecimal.test(text) ? inRange(Number(text + exponents[unit])) : Number.NaN
}

/** A time as text in `bytes[from, to)`, in the unit stated. */
export const readTime = (bytes: Uint8Array, from: number, to: number, unit: TimeUnit): number =>
  unit === 'rfc3339' ? readRfc3339(bytes, from, to) : epochText(latin1(bytes, from, to), unit)
