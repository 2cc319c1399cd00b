/**
 * A moment (milliseconds since 1970 UTC) as RFC 3339 in UTC, to the millisecond where it has a fraction of
 * a second: `2026-11-02T10:42:05Z`. Throws RangeError outside the years that a `Date` knows.
 */
export const rfc3339 = (ms: number): string => new Date(Math.round(ms)).toISOString().replace('.000Z', 'Z')

export const rfc3339OrNull = (ms: number | null): string | null => (ms === null ? null : rfc3339(ms))
