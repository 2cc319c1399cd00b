import { z } from 'zod'
import type { Judged } from '../ensemble.ts'
import type { Finding } from '../frames/frame.ts'
import { type DropCounts, dropReasons, findingKinds } from '../reasons.ts'
import { type Shift, shiftKinds, states, type Transition } from '../regime/regime.ts'

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
    window: z.strictObject({ frames: count, effective: z.number() }),
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
    number: count,
    kind: z.enum(shiftKinds),
    start: time,
    start_from: time,
    start_to: time,
    confirmed: time,
    frame: count,
    carriers: z.array(carrierSchema),
    remainder: z.number(),
    share_before: z.number(),
    share_after: z.number(),
    distance: distanceSchema,
    evidence: z.strictObject({
      statistic: z.string(),
      value: z.number(),
      limit: z.number(),
      ratio: z.number(),
    }),
    certificate: known(z.number()),
    sight: z.number(),
    likeness: z.array(z.strictObject({ regime: count, likeness: z.number() })),
    statistics: z.array(z.strictObject({ statistic: z.string(), value: z.number(), limit: z.number() })),
    spectrum_before: z.array(z.number()),
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

export const recordSchema = z.discriminatedUnion('type', [
  frameRecordSchema,
  shiftRecordSchema,
  transitionRecordSchema,
  findingRecordSchema,
  summaryRecordSchema,
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

export function frameRecord(judged: Judged): FrameRecord {
  const { verdict, bulk, window } = judged
  return {
    type: 'frame',
    ensemble: judged.ensemble,
    frame: judged.frame,
    time: timestamp(judged.time),
    state: verdict.state,
    signals: judged.signals,
    missing: judged.missing,
    window: { frames: window.frames, effective: window.effective },
    share: judged.share,
    leading: [...judged.leading],
    edge:
      bulk === null
        ? null
        : {
            model: bulk.model,
            lower: bulk.lower,
            upper: bulk.upper,
            level: bulk.level,
            limit: bulk.limit,
            fit: bulk.fit,
          },
    escapes: bulk === null ? [] : bulk.escapes.map(({ value, signals }) => ({ value, signals })),
    distance: verdict.distance === null ? null : { ...verdict.distance },
    evidence:
      verdict.evidence === null
        ? null
        : {
            ratio: verdict.evidence.ratio,
            statistic: verdict.evidence.statistic,
            since: timestampOrNull(verdict.evidence.since),
          },
    certificate: judged.certificate,
    sight: verdict.sight,
    spectrum: judged.spectrum,
  }
}

export function shiftRecord(ensemble: string, shift: Shift): ShiftRecord {
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
    carriers: [...shift.carriers],
    remainder: shift.remainder,
    share_before: shift.shareBefore,
    share_after: shift.shareAfter,
    distance: { ...shift.distance },
    evidence: { ...shift.evidence },
    certificate: shift.certificate,
    sight: shift.sight,
    likeness: [...shift.likeness],
    statistics: [...shift.statistics],
    spectrum_before: [...shift.spectrumBefore],
    spectrum_after: [...shift.spectrumAfter],
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

/** The published JSON Schema of one record (schema/records.schema.json). */
export function recordsJsonSchema(): Record<string, unknown> {
  return { title: 'Tautline records', ...z.toJSONSchema(recordSchema) }
}
