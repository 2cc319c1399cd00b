import { z } from 'zod'
import type { Bulk } from '../bulk/bulk.ts'
import type { Judged } from '../ensemble.ts'
import type { Finding } from '../frames/frame.ts'
import { type DropCounts, dropReasons, findingKinds } from '../reasons.ts'
import { type Distance, type Shift, shiftKinds, states, type Transition } from '../regime/regime.ts'

/** Records of `replay --json` and `watch --json`: one object a line, `type` first. This file is their one source. */

const time = z.iso.datetime({ offset: false }).meta({ description: 'RFC 3339, UTC.' })
const known = <T extends z.ZodType>(schema: T) => schema.nullable()
const count = z.number().int().min(0)

const distanceSchema = z.strictObject({
  w2: z.number(),
  ceiling: z.number(),
  rotation: z.number(),
})

const carrierSchema = z.strictObject({ signal: z.string(), share: z.number() })

export const frameRecordSchema = z
  .strictObject({
    type: z.literal('frame'),
    ensemble: z.string(),
    frame: count.meta({ description: 'From 0 at the first closed frame.' }),
    time: time.meta({ description: 'End of the frame.' }),
    state: z.enum(states),
    signals: count.meta({ description: 'Signals that take part in the matrix.' }),
    missing: count.meta({ description: 'Signals without a value in this frame.' }),
    window: z.strictObject({ frames: count, effective: known(z.number()) }),
    share: known(z.number()).meta({ description: 'Leading eigenvalue over the trace.' }),
    leading: z.array(z.number()).meta({ description: 'Largest eigenvalues, at most eight.' }),
    edge: known(
      z.strictObject({
        model: z.enum(['marchenko-pastur', 'exponential', 'resampled']),
        lower: z.number(),
        upper: z.number(),
        level: z.number(),
        limit: z.number().meta({ description: 'An eigenvalue above it is an escape at the level.' }),
        fit: z.number().meta({ description: 'Kolmogorov–Smirnov distance of the bulk to its law.' }),
      }),
    ),
    escapes: z.array(z.strictObject({ value: z.number(), signals: z.number() })),
    distance: known(distanceSchema),
    evidence: known(z.strictObject({ ratio: z.number(), statistic: z.string(), since: known(time) })),
    certificate: known(z.number()),
    sight: known(z.number()),
    spectrum: known(z.strictObject({ age: count, bound: z.number() })),
  })
  .meta({ title: 'Frame' })

export const shiftRecordSchema = z
  .strictObject({
    type: z.literal('shift'),
    ensemble: z.string(),
    number: count.meta({ description: 'Counts the shifts of the ensemble, from 1.' }),
    kind: z.enum(shiftKinds),
    start: time.meta({ description: 'Estimate of when it began; the interval is start_from to start_to.' }),
    start_from: time,
    start_to: time,
    confirmed: time,
    frame: count.meta({ description: 'Frame in which it was confirmed.' }),
    carriers: z.array(carrierSchema),
    remainder: known(z.number()).meta({ description: 'With the shares of all signals it makes 1.' }),
    share_before: known(z.number()).meta({ description: 'Leading eigenvalue over the trace, reference.' }),
    share_after: known(z.number()),
    distance: known(distanceSchema),
    evidence: z.strictObject({
      statistic: z.string(),
      value: known(z.number()),
      limit: known(z.number()),
      ratio: known(z.number()),
    }),
    certificate: known(z.number()),
    sight: known(z.number()).meta({ description: 'Weakest mode that can be seen, over the noise variance.' }),
    likeness: z.array(z.strictObject({ regime: count, likeness: z.number() })),
    statistics: z.array(z.strictObject({ statistic: z.string(), value: z.number(), limit: z.number() })),
    spectrum_before: z.array(z.number()).meta({ description: 'Eigenvalues, largest first.' }),
    spectrum_after: z.array(z.number()),
  })
  .meta({ title: 'Shift' })

export const transitionRecordSchema = z
  .strictObject({
    type: z.literal('transition'),
    ensemble: z.string(),
    time,
    frame: count,
    from: z.enum(states),
    to: z.enum(states),
    why: z.string(),
    shift: known(count),
  })
  .meta({ title: 'Transition' })

export const findingRecordSchema = z
  .strictObject({
    type: z.literal('finding'),
    ensemble: z.string(),
    signal: known(z.string()).meta({ description: 'null: the whole ensemble.' }),
    finding: z.enum(findingKinds),
    from: time,
    to: known(time).meta({ description: 'null while it lasts.' }),
    detail: z.string(),
  })
  .meta({ title: 'Finding' })

export const summaryRecordSchema = z
  .strictObject({
    type: z.literal('summary'),
    readings: count,
    dropped: z.partialRecord(z.enum(Object.keys(dropReasons) as [keyof typeof dropReasons]), count),
    frames: count,
    shifts: count,
    findings: count,
    seconds: z.number(),
  })
  .meta({ title: 'Summary' })

export const errorRecordSchema = z
  .strictObject({
    type: z.literal('error'),
    code: z
      .string()
      .regex(/^[a-z]+(-[a-z]+)*$/)
      .meta({ description: 'From the catalogue of errors.' }),
    sentence: z.string(),
    detail: z.string(),
    remedy: z.string(),
    problems: z
      .array(z.looseObject({ code: z.string(), line: count, column: count, key: z.string() }))
      .meta({ description: 'What is wrong in the settings, place by place.' }),
  })
  .meta({ title: 'Error', description: 'What ended the run; the last record.' })

export const recordSchema = z.discriminatedUnion('type', [
  frameRecordSchema,
  shiftRecordSchema,
  transitionRecordSchema,
  findingRecordSchema,
  summaryRecordSchema,
  errorRecordSchema,
])

export type FrameRecord = z.output<typeof frameRecordSchema>
export type ShiftRecord = z.output<typeof shiftRecordSchema>
export type TransitionRecord = z.output<typeof transitionRecordSchema>
export type FindingRecord = z.output<typeof findingRecordSchema>
export type SummaryRecord = z.output<typeof summaryRecordSchema>
export type TautlineRecord = z.output<typeof recordSchema>

/** RFC 3339 in UTC, milliseconds only where there are any. `ms` since 1970. */
export const timestamp = (ms: number): string => new Date(Math.round(ms)).toISOString().replace('.000Z', 'Z')

const timestampOrNull = (ms: number | null): string | null => (ms === null ? null : timestamp(ms))

/**
 * What keeps a record free of what JSON does not know. Nothing in the house gives a figure that is not finite,
 * and a test holds that; should one come all the same, it is null, and so is the group that it belongs to.
 */
const figure = (value: number | null): number | null =>
  value !== null && Number.isFinite(value) ? value : null

const isWhole = (group: object): boolean =>
  Object.values(group).every((value) => typeof value !== 'number' || Number.isFinite(value))

const group = <T extends object>(value: T | null): T | null =>
  value !== null && isWhole(value) ? value : null

const figures = (values: ArrayLike<number>): number[] => {
  const list = Array.from(values)
  return list.every(Number.isFinite) ? list : []
}

export function frameRecord(judged: Judged): FrameRecord {
  const { verdict, bulk, window } = judged
  const { distance, evidence } = verdict
  return {
    type: 'frame',
    ensemble: judged.ensemble,
    frame: judged.frame,
    time: timestamp(judged.time),
    state: verdict.state,
    signals: judged.signals,
    missing: judged.missing,
    window: { frames: window.frames, effective: figure(window.effective) },
    share: figure(judged.share),
    leading: figures(judged.leading),
    edge: bulk === null ? null : group(edgeOf(bulk)),
    escapes: (bulk?.escapes ?? []).map(({ value, signals }) => ({ value, signals })).filter(isWhole),
    distance: group(distance === null ? null : distanceOf(distance)),
    evidence:
      evidence === null || !Number.isFinite(evidence.ratio)
        ? null
        : {
            ratio: evidence.ratio,
            statistic: evidence.statistic,
            since: timestampOrNull(evidence.since),
          },
    certificate: figure(judged.certificate),
    sight: figure(verdict.sight),
    spectrum: group(judged.spectrum),
  }
}

const edgeOf = ({ model, lower, upper, level, limit, fit }: Bulk) => ({
  model,
  lower,
  upper,
  level,
  limit,
  fit,
})

const distanceOf = ({ w2, ceiling, rotation }: Distance) => ({ w2, ceiling, rotation })

export function shiftRecord(ensemble: string, shift: Shift): ShiftRecord {
  const { evidence } = shift
  return {
    type: 'shift',
    ensemble,
    number: shift.number,
    kind: shift.kind,
    start: timestamp(shift.start),
    start_from: timestamp(shift.startFrom),
    start_to: timestamp(shift.startTo),
    confirmed: timestamp(shift.confirmed),
    frame: shift.frame,
    carriers: shift.carriers.filter(isWhole),
    remainder: figure(shift.remainder),
    share_before: figure(shift.shareBefore),
    share_after: figure(shift.shareAfter),
    distance: group(distanceOf(shift.distance)),
    evidence: {
      statistic: evidence.statistic,
      value: figure(evidence.value),
      limit: figure(evidence.limit),
      ratio: figure(evidence.ratio),
    },
    certificate: figure(shift.certificate),
    sight: figure(shift.sight),
    likeness: shift.likeness.filter(isWhole),
    statistics: shift.statistics.filter(isWhole),
    spectrum_before: figures(shift.spectrumBefore),
    spectrum_after: figures(shift.spectrumAfter),
  }
}

export function transitionRecord(ensemble: string, transition: Transition): TransitionRecord {
  const { time: at, frame, from, to, why, shift } = transition
  return { type: 'transition', ensemble, time: timestamp(at), frame, from, to, why, shift }
}

export function findingRecord(
  ensemble: string,
  { signal, finding, from, to, detail }: Finding,
): FindingRecord {
  return {
    type: 'finding',
    ensemble,
    signal,
    finding,
    from: timestamp(from),
    to: timestampOrNull(to),
    detail,
  }
}

export function summaryRecord(totals: {
  readings: number
  dropped: DropCounts
  frames: number
  shifts: number
  findings: number
  seconds: number
}): SummaryRecord {
  return { type: 'summary', ...totals }
}

/** An identifier, not an address to fetch. */
const recordsSchemaId = 'urn:tautline:records:1'

/** The published JSON Schema of one record (schema/records.schema.json). */
export function recordsJsonSchema(): Record<string, unknown> {
  const { $schema, ...rest } = z.toJSONSchema(recordSchema)
  return { $schema, $id: recordsSchemaId, title: 'Records of Tautline', ...rest }
}
