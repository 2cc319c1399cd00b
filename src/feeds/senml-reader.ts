import type { BatchBuilder } from './batch-builder.ts'
import { parseJson } from './json-reader.ts'
import type { DocumentReader } from './record-reader.ts'
import { inRange } from './times.ts'

/** Times below this many seconds are relative to now (RFC 8428, section 4.5.3). */
const relativeBelow = 2 ** 28
/** The version of RFC 8428 (section 4.4). */
const knownVersion = 10

const valueLabels = ['v', 'vb', 'vs', 'vd'] as const

/** Base fields in force; they hold from the record that states them on, until stated anew. */
interface Base {
  name: string
  time: number
  value: number
}

const numberOr = (stated: unknown, otherwise: number): number | null =>
  stated === undefined ? otherwise : typeof stated === 'number' ? stated : null

/**
 * Reads one SenML pack in JSON (RFC 8428; section numbers from memory). Base name, time and value are
 * resolved, units are left alone. `v` gives a reading, `vb` one of 0 or 1. Texts (`vs`), data (`vd`) and
 * records with a sum (`s`) alone are counted as `bad-value`; a record of base fields alone is no reading. A
 * pack of a later version, or with a label that must be understood (it ends in an underscore), is
 * unreadable as a whole.
 */
export const senmlReader: DocumentReader = (bytes, from, to, out) => {
  const parsed = parseJson(bytes, from, to, out)
  if (parsed === undefined) return
  const refuse = (detail: string) => out.refuse('unreadable', detail, bytes, from, to)
  const pack = parsed.value
  if (!Array.isArray(pack)) return refuse('a SenML pack is an array')
  for (const record of pack) {
    const problem = problemOf(record)
    if (problem !== null) return refuse(problem)
  }
  const base: Base = { name: '', time: 0, value: 0 }
  for (const record of pack) takeRecord(record as Record<string, unknown>, base, bytes, from, to, out)
}

/** Why the whole pack must not be used, or null. */
function problemOf(record: unknown): string | null {
  if (typeof record !== 'object' || record === null || Array.isArray(record))
    return 'a SenML record is an object'
  for (const label of Object.keys(record))
    if (label.endsWith('_')) return 'a label that ends in an underscore must be understood, and is not'
  const { bver, bn, bt, bv } = record as Record<string, unknown>
  if (bver !== undefined && !(typeof bver === 'number' && bver <= knownVersion))
    return `only SenML up to version ${knownVersion} is understood`
  if (bn !== undefined && typeof bn !== 'string') return 'the base name is no text'
  if (numberOr(bt, 0) === null) return 'the base time is no number'
  if (numberOr(bv, 0) === null) return 'the base value is no number'
  return null
}

function takeRecord(
  record: Record<string, unknown>,
  base: Base,
  bytes: Buffer,
  from: number,
  to: number,
  out: BatchBuilder,
): void {
  if (record.bn !== undefined) base.name = record.bn as string
  if (record.bt !== undefined) base.time = record.bt as number
  if (record.bv !== undefined) base.value = record.bv as number
  const { n, t, v, vb, s } = record
  const values = valueLabels.filter((label) => record[label] !== undefined)
  if (values.length === 0 && s === undefined && n === undefined && t === undefined) return
  if (values.length !== 1 && !(values.length === 0 && s !== undefined)) {
    out.refuse('unreadable', 'a SenML record has one value or a sum', bytes, from, to)
    return
  }
  if (n !== undefined && typeof n !== 'string') {
    out.refuse('bad-signal', 'the name is no text', bytes, from, to)
    return
  }
  const time = timeOf(numberOr(t, 0), base, out.now())
  if (Number.isNaN(time)) {
    out.refuse('bad-time', 'the time is no number of seconds of the years 1900 to 2200', bytes, from, to)
    return
  }
  const value = typeof v === 'number' ? base.value + v : typeof vb === 'boolean' ? Number(vb) : Number.NaN
  if (!Number.isFinite(value)) {
    const what = values.length === 0 ? 'a sum alone' : `"${values[0]}"`
    out.refuse('bad-value', `${what} gives no finite number`, bytes, from, to)
    return
  }
  const signal = out.names.internText(base.name + (n ?? ''))
  if (signal < 0) out.refuseName(signal, bytes, from, to)
  else out.add(signal, time, value)
}

/** Milliseconds since 1970 UTC, to the microsecond. */
function timeOf(stated: number | null, base: Base, now: number): number {
  if (stated === null) return Number.NaN
  const seconds = base.time + stated
  const ms = Math.round(seconds * 1e6) / 1e3
  return inRange(seconds < relativeBelow ? now + ms : ms)
}
