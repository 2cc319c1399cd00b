import { z } from 'zod'
import { count, duration, falsePages, httpUrl, text, timeOfDay } from './scalars.ts'

export const sessionsSchema = z
  .strictObject({
    zone: text.meta({ description: 'IANA time zone of the market.', examples: ['Europe/Oslo'] }),
    open: timeOfDay.meta({ description: 'Local time at which trading opens.', examples: ['09:00'] }),
    close: timeOfDay.meta({
      description: 'Local time at which trading closes; earlier than `open` when it closes on the next day.',
      examples: ['16:20'],
    }),
    days: text
      .default('mon-fri')
      .meta({ description: 'Days of the week: a span or a list.', examples: ['mon-fri', 'mon,wed,fri'] }),
    holidays: z
      .array(z.iso.date())
      .max(10_000)
      .default([])
      .meta({ description: 'Dates, local to the zone, on which the market stays closed.' }),
  })
  .meta({ title: 'Sessions', description: 'Trading sessions; no increment is taken across a closed market.' })

export const clockSchema = z
  .strictObject({
    step: z.union([z.literal('row'), duration]).meta({
      description: 'Length of a frame; or `row`: every distinct time stamp is a frame.',
      examples: ['5s', 'row'],
    }),
    lateness: duration.prefault('0s').meta({
      description: 'So long a frame stays open for readings that come late.',
      examples: ['2s'],
    }),
    'stale-after': duration.optional().meta({
      description: 'A value older than this is missing. Default: 12 steps; with `step: row` one row.',
      examples: ['60s'],
    }),
    'idle-after': duration.prefault('30s').meta({
      description: 'A source that is read up to its end and silent so long no longer holds the clock.',
    }),
    ahead: duration
      .prefault('1d')
      .meta({ description: 'Readings further than this ahead of the present are dropped.' }),
    sessions: sessionsSchema.optional(),
  })
  .meta({ title: 'Clock', description: 'The clock of the ensemble, in event time.' })

const signalsSchema = z
  .union([
    z.array(text).min(2).max(5000).meta({ description: 'The signals by name.' }),
    z.strictObject({
      pattern: text.meta({
        description: 'Glob: * any run of characters, ? one character.',
        examples: ['PT-*'],
      }),
      limit: count.default(2000).meta({ description: 'At most so many signals are taken in.' }),
    }),
    z.strictObject({ file: text.meta({ description: 'File with one signal name a line.' }) }),
  ])
  .meta({ description: 'The signals that are watched together: a list, a pattern or a file.' })

const windowSchema = z
  .union([
    z.strictObject({
      frames: z.number().int().min(8).max(1_000_000).meta({ description: 'The last so many frames.' }),
    }),
    z.strictObject({
      'half-life': z
        .number()
        .min(4)
        .max(1_000_000)
        .meta({ description: 'Exponential memory: a frame counts half after so many frames.' }),
    }),
  ])
  .meta({ description: 'The present: how many frames the correlation matrix is made of.' })

const referenceFrames = z.number().int().min(16).max(1_000_000)

const referenceSchema = z
  .union([
    z.strictObject({
      frames: referenceFrames.meta({ description: 'Learnt from the first so many frames.' }),
    }),
    z.strictObject({
      from: text.meta({ description: 'File with a reference, as `tautline explain --reference` writes it.' }),
    }),
    z.strictObject({
      since: z
        .union([z.iso.date(), z.iso.datetime({ offset: true })])
        .meta({ description: 'Learnt from the frames since this date or time.', examples: ['2026-11-02'] }),
      frames: z
        .number()
        .int()
        .min(16)
        .max(1_000_000)
        .default(600)
        .meta({ description: 'Learnt from so many frames.' }),
    }),
    z.strictObject({
      lagged: z
        .number()
        .int()
        .min(1)
        .max(1_000_000)
        .meta({ description: 'The window that ended so many frames ago.' }),
    }),
  ])
  .meta({ description: 'The state that the present is compared with.' })

const plannedSchema = z
  .strictObject({
    from: z.iso
      .datetime({ offset: true })
      .meta({ description: 'Begin of the change.', examples: ['2026-11-07T06:00:00+01:00'] }),
    to: z.iso.datetime({ offset: true }).meta({ description: 'End of the change.' }),
    note: text.optional().meta({ description: 'What is changed.' }),
  })
  .meta({ title: 'Planned change', description: 'An announced change.' })

export const ensembleSchema = z
  .strictObject({
    title: text.optional().meta({ description: 'Name that people read. Default: the key.' }),
    feeds: z
      .array(text)
      .min(1)
      .optional()
      .meta({ description: 'Names of the feeds it draws from. Default: all.' }),
    signals: signalsSchema,
    clock: clockSchema,
    increment: z.enum(['log-return', 'difference', 'level']).default('log-return').meta({
      description:
        'What is taken of each signal: log-return for prices, difference, or level (less its slow mean) for transmitters.',
    }),
    memory: z.enum(['none', 'prewhiten', 'effective-sample']).default('none').meta({
      description:
        'Remedy for signals that remember their own past: prewhiten each, or count fewer effective frames.',
    }),
    window: windowSchema,
    reference: referenceSchema.default({ frames: 600 }),
    scale: z.enum(['correlation', 'covariance']).default('correlation').meta({
      description: 'covariance keeps the scale of the reference and so sees pure changes of amplitude.',
    }),
    'common-volatility': z.enum(['remove', 'keep']).default('remove').meta({
      description: 'remove: a burst in which all amplitudes swell together is no change of correlation.',
    }),
    truncate: z
      .union([
        z.literal('off'),
        z.strictObject({
          at: z.number().min(1).max(100).meta({ description: 'In robust standard deviations.' }),
        }),
      ])
      .default({ at: 5 })
      .meta({
        description: 'Clips extreme values; every verdict carries the certificate of what that moved.',
      }),
    level: z
      .number()
      .min(0.0001)
      .max(0.2)
      .default(0.01)
      .meta({ description: 'Chance that the largest noise eigenvalue of a frame counts as an escape.' }),
    limits: z
      .union([
        z.strictObject({
          'false-pages': falsePages.meta({
            description: 'Budget: at most so many false pages in so much time.',
            examples: ['1 per 90d'],
          }),
        }),
        z.strictObject({
          explicit: z
            .record(z.string(), z.number().positive())
            .meta({ description: 'A limit for each statistic, by name.' }),
        }),
      ])
      .prefault({ 'false-pages': '1 per 90d' })
      .meta({ description: 'The limits beyond which evidence counts.' }),
    'stuck-after': duration.optional().meta({
      description:
        'A signal whose value has not moved for so long is stuck. Default: learnt from its own history.',
    }),
    planned: z
      .array(plannedSchema)
      .max(10_000)
      .default([])
      .meta({ description: 'Announced changes: a new reference is learnt without paging.' }),
    runbook: httpUrl.optional().meta({ description: 'Address of the page that says what to do.' }),
  })
  .meta({ title: 'Ensemble', description: 'Signals that are watched together.' })
