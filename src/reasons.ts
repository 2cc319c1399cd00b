/**
 * The closed list of reasons for which a reading or a record is dropped. Every drop is counted under
 * exactly one of them (`tautline_readings_dropped_total{feed,reason}`, the `summary` record, the page).
 */
export const dropReasons = {
  unreadable: 'the record is not in the format that the settings state (broken JSON, missing field, bad row)',
  'too-long': 'the record is longer than the limit and was skipped without being held in memory',
  'bad-time': 'the time stamp cannot be read or lies outside the years 1900 to 2200',
  ahead: 'the time stamp lies further ahead of the present than the feed allows',
  'bad-value': 'the value is not a finite number (NaN, infinite, not a number, or too large for one)',
  'not-positive': 'the value is zero or negative and the increment is a log-return',
  'bad-signal': 'the signal name is empty, longer than 200 characters or holds control characters',
  'unknown-signal': 'no ensemble watches a signal of that name',
  'too-many-signals':
    'the feed, or the pattern of the ensemble, has more different signals than its limit allows',
  late: 'the frame to which the reading belongs was closed before it came',
  closed: 'the reading lies outside the trading sessions',
  duplicate: 'a reading of the same signal and time was already taken',
  'bad-compression': 'the compressed data are damaged or cut off',
} as const

export type DropReason = keyof typeof dropReasons

/** Counts of drops by reason; absent means zero. */
export type DropCounts = Partial<Record<DropReason, number>>

/** The sum of two counts. */
export function addDrops(a: DropCounts, b: DropCounts): DropCounts {
  const sum: DropCounts = { ...a }
  for (const [reason, count] of Object.entries(b) as [DropReason, number][]) {
    sum[reason] = (sum[reason] ?? 0) + count
  }
  return sum
}

/** Findings about one signal (or, for `gap`, about the whole ensemble). */
export const findingKinds = ['stuck', 'stale', 'clipped', 'gap', 'duplicate', 'out-of-order'] as const
export type FindingKind = (typeof findingKinds)[number]
