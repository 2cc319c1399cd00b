import type { BatchBuilder } from './batch-builder.ts'
import { utf8 } from './decimal.ts'
import { pointAt, pointerSteps } from './pointer.ts'
import type { DocumentReader } from './record-reader.ts'
import { epochNumber, longestTime, readTime, type TimeUnit } from './times.ts'

/** How a time is taken: as a JSON number, as a JSON text. */
export interface TimeRule {
  /** null: a number is no time. */
  readonly number: Exclude<TimeUnit, 'rfc3339'> | null
  readonly text: TimeUnit
}

export const timeRule = (unit: TimeUnit): TimeRule =>
  unit === 'rfc3339' ? { number: null, text: 'rfc3339' } : { number: unit, text: unit }

/** NDJSON: a number is epoch milliseconds, a text RFC 3339. */
export const eitherTime: TimeRule = { number: 'ms', text: 'rfc3339' }

export interface JsonPointers {
  readonly signal: string
  readonly time: string
  readonly value: string
  /** Pointer to the array of readings; the three others are then relative to each of its elements. */
  readonly readings: string | null
}

/** Deepest nesting of arrays and objects in a record. */
export const deepest = 64

/** Reads one JSON document by RFC 6901 pointers: one reading, or an array of them. */
export function jsonReader(pointers: JsonPointers, rule: TimeRule): DocumentReader {
  const signalAt = pointerSteps(pointers.signal)
  const timeAt = pointerSteps(pointers.time)
  const valueAt = pointerSteps(pointers.value)
  const readingsAt = pointers.readings === null ? null : pointerSteps(pointers.readings)

  const take = (reading: unknown, bytes: Buffer, from: number, to: number, out: BatchBuilder): void => {
    const name = pointAt(reading, signalAt)
    const stated = pointAt(reading, timeAt)
    const value = pointAt(reading, valueAt)
    if (name === undefined || stated === undefined || value === undefined) {
      const missing = name === undefined ? 'signal' : stated === undefined ? 'time' : 'value'
      out.refuse(
        'unreadable',
        `there is no ${missing} at ${pointers[missing] || 'the whole'}`,
        bytes,
        from,
        to,
      )
      return
    }
    if (typeof name !== 'string') {
      out.refuse('bad-signal', `the signal name is ${kindOf(name)}, not a text`, bytes, from, to)
      return
    }
    const time = timeOf(stated, rule)
    if (Number.isNaN(time)) {
      out.refuse('bad-time', `${kindOf(stated)} is no ${wanted(stated, rule)}`, bytes, from, to)
      return
    }
    if (typeof value !== 'number' || !Number.isFinite(value)) {
      const what = typeof value === 'number' ? 'too large for a number' : `${kindOf(value)}, not a number`
      out.refuse('bad-value', `the value is ${what}`, bytes, from, to)
      return
    }
    const signal = out.names.internText(name)
    if (signal < 0) out.refuseName(signal, bytes, from, to)
    else out.add(signal, time, value)
  }

  return (bytes, from, to, out) => {
    const parsed = parseJson(bytes, from, to, out)
    if (parsed === undefined) return
    if (readingsAt === null) {
      take(parsed.value, bytes, from, to, out)
      return
    }
    const readings = pointAt(parsed.value, readingsAt)
    if (!Array.isArray(readings))
      out.refuse('unreadable', `there is no array at ${pointers.readings || 'the whole'}`, bytes, from, to)
    else for (const reading of readings) take(reading, bytes, from, to, out)
  }
}

/** The parsed document, or undefined when it was refused. */
export function parseJson(
  bytes: Buffer,
  from: number,
  to: number,
  out: BatchBuilder,
): { readonly value: unknown } | undefined {
  if (isDeeper(bytes, from, to, deepest)) {
    out.refuse('unreadable', `nested deeper than ${deepest} levels`, bytes, from, to)
    return undefined
  }
  try {
    return { value: JSON.parse(utf8(bytes, from, to)) }
  } catch {
    out.refuse('unreadable', 'not JSON', bytes, from, to)
    return undefined
  }
}

function isDeeper(bytes: Buffer, from: number, to: number, limit: number): boolean {
  if (to - from <= limit) return false
  let depth = 0
  let inText = false
  for (let p = from; p < to; p++) {
    const c = bytes[p]!
    if (inText) {
      if (c === 92) p++
      else if (c === 34) inText = false
    } else if (c === 34) inText = true
    else if (c === 123 || c === 91) {
      if (++depth > limit) return true
    } else if (c === 125 || c === 93) depth--
  }
  return false
}

function timeOf(stated: unknown, rule: TimeRule): number {
  if (typeof stated === 'number') return rule.number === null ? Number.NaN : epochNumber(stated, rule.number)
  if (typeof stated !== 'string' || stated.length > longestTime) return Number.NaN
  const bytes = Buffer.from(stated, 'utf8')
  return readTime(bytes, 0, bytes.length, rule.text)
}

function wanted(stated: unknown, rule: TimeRule): string {
  const unit = typeof stated === 'number' && rule.number !== null ? rule.number : rule.text
  return unit === 'rfc3339'
    ? 'RFC 3339 time of the years 1900 to 2200'
    : `time in ${unit} of the years 1900 to 2200`
}

const kindOf = (value: unknown): string => {
  if (value === null) return 'null'
  if (Array.isArray(value)) return 'an array'
  if (typeof value === 'object') return 'an object'
  if (typeof value === 'boolean') return String(value)
  return typeof value === 'string' ? 'a text' : `the number ${value}`
}
