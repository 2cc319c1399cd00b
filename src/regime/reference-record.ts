import { failed, ok, type Result, TautlineError } from '../errors.ts'
import type { SymmetricSolver } from '../spectrum/spectrum.ts'
import { type Reference, solvedBase, submatrix } from './reference.ts'

/** A reference as it is kept in a JSON file (`reference: { from: FILE }`). */
export interface ReferenceRecord {
  readonly type: 'reference'
  readonly names: readonly string[]
  /** Frames it was made from. */
  readonly frames: number
  /** Correlation matrix, row by row. */
  readonly matrix: readonly (readonly number[])[]
  /** Mean and standard deviation of each signal's cleaned increments. */
  readonly means: readonly number[]
  readonly scales: readonly number[]
  /** Loudest frame at full weight, in multiples of the median energy. */
  readonly spread: number
  /** Unevenness of the frames' loudness; 1 when all are equally loud. */
  readonly unevenness: number
}

/** The record of a reference, for writing as JSON. `names`: the roster, index by index. */
export function recordOf(reference: Reference, names: readonly string[]): ReferenceRecord {
  const { indices, matrix, n } = reference
  return {
    type: 'reference',
    names: Array.from(indices, (i) => names[i] ?? `#${i}`),
    frames: reference.frames,
    matrix: Array.from(indices, (_, a) => [...matrix.subarray(a * n, (a + 1) * n)]),
    means: Array.from(indices, (i) => reference.means[i]!),
    scales: Array.from(indices, (i) => reference.scales[i]!),
    spread: Math.min(reference.spread, 1e12),
    unevenness: reference.unevenness,
  }
}

const fault = (detail: string): Result<never> => failed(new TautlineError('reference-unreadable', detail))
const isNumbers = (v: unknown, length: number): v is number[] =>
  Array.isArray(v) && v.length === length && v.every((x) => typeof x === 'number' && Number.isFinite(x))

/**
 * Checks parsed JSON as a reference record. Fails with `reference-unreadable`, saying which part is wrong.
 * `means` and `scales` may be left out (0 and 1: increments already in the reference's scale), `spread` (4)
 * and `unevenness` (1.2) too.
 */
export function readReference(json: unknown): Result<ReferenceRecord> {
  if (typeof json !== 'object' || json === null) return fault('It is not a JSON object.')
  const r = json as Record<string, unknown>
  const names = r.names
  if (!Array.isArray(names) || names.length < 2 || !names.every((name) => typeof name === 'string')) {
    return fault('"names" is not a list of two or more signal names.')
  }
  const n = names.length
  if (new Set(names).size !== n) return fault('"names" holds a name twice.')
  const frames = r.frames
  if (typeof frames !== 'number' || !Number.isInteger(frames) || frames < 2) {
    return fault('"frames" is not a whole number of at least 2.')
  }
  const matrix: unknown = r.matrix
  const isMatrix = (v: unknown): v is number[][] =>
    Array.isArray(v) && v.length === n && v.every((row) => isNumbers(row, n))
  if (!isMatrix(matrix)) {
    return fault(`"matrix" is not ${n} rows of ${n} numbers.`)
  }
  const entry = (i: number, j: number): number => matrix[i]![j]!
  for (let i = 0; i < n; i++) {
    if (Math.abs(entry(i, i) - 1) > 1e-6) return fault(`"matrix" has ${entry(i, i)} on its diagonal, not 1.`)
    for (let j = 0; j < i; j++) {
      if (Math.abs(entry(i, j) - entry(j, i)) > 1e-9 || Math.abs(entry(i, j)) > 1 + 1e-9) {
        return fault(`"matrix" is no correlation matrix at row ${i + 1}, column ${j + 1}.`)
      }
    }
  }
  const means = r.means ?? new Array(n).fill(0)
  const scales = r.scales ?? new Array(n).fill(1)
  if (!isNumbers(means, n)) return fault(`"means" is not ${n} numbers.`)
  if (!isNumbers(scales, n) || !scales.every((s) => s > 0))
    return fault(`"scales" is not ${n} positive numbers.`)
  const spread = r.spread ?? 4
  if (typeof spread !== 'number' || !(spread >= 1)) return fault('"spread" is not a number of at least 1.')
  const uneven = r.unevenness ?? 1.2
  if (typeof uneven !== 'number' || !(uneven >= 1))
    return fault('"unevenness" is not a number of at least 1.')
  return ok({ type: 'reference', names, frames, matrix, means, scales, spread, unevenness: uneven })
}

/** The reference on the signals of it that the roster has; null when these are fewer than two. */
export function referenceOf(
  record: ReferenceRecord,
  roster: readonly string[],
  solver: SymmetricSolver,
): Reference | null {
  const place = new Map(record.names.map((name, a) => [name, a]))
  const indices: number[] = []
  for (let i = 0; i < roster.length; i++) if (place.has(roster[i]!)) indices.push(i)
  const n = indices.length
  if (n < 2) return null
  const places = Int32Array.from(indices, (i) => place.get(roster[i]!)!)
  const matrix = submatrix(Float64Array.from(record.matrix.flat()), record.names.length, places)
  const means = new Float64Array(roster.length)
  const scales = new Float64Array(roster.length)
  indices.forEach((i, a) => {
    means[i] = record.means[places[a]!]!
    scales[i] = record.scales[places[a]!]!
  })
  return {
    ...solvedBase(matrix, n, solver),
    indices: Int32Array.from(indices),
    frames: record.frames,
    means,
    scales,
    spread: record.spread,
    unevenness: record.unevenness,
    bounded: matrix.slice(),
  }
}
