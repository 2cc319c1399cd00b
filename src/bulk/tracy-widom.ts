import { logOdds, logOddsSlope, tableStart, tableStep } from './tracy-widom-table.ts'

/**
 * Tracy–Widom law F1 of the largest eigenvalue of real symmetric noise (Tracy & Widom 1996): cubic Hermite
 * interpolation of the log odds ln(F/(1 − F)), tabulated from the Fredholm determinant of Ferrari & Spohn
 * (2005) by Bornemann's method (2010), see test/bulk/reference/tracy-widom.py. Beyond the table the leading
 * terms of the tails go on.
 */
const tableEnd = tableStart + (logOdds.length - 1) * tableStep
const lastRow = logOdds.length - 1

/** P(s' ≤ s). */
export const tracyWidomCdf = (s: number): number => 1 / (1 + Math.exp(-logOddsAt(s)))

/** P(s' > s), with full relative precision in the upper tail. */
export const tracyWidomSurvival = (s: number): number => 1 / (1 + Math.exp(logOddsAt(s)))

/** Density of the law at s; 0 beyond the table. */
export function tracyWidomDensity(s: number): number {
  if (s < tableStart || s > tableEnd) return 0
  const { row, u } = placeOf(s)
  const rise = (logOdds[row + 1]! - logOdds[row]!) / tableStep
  const m0 = logOddsSlope[row]!
  const m1 = logOddsSlope[row + 1]!
  const slope = m0 + 2 * u * (3 * rise - 2 * m0 - m1) + 3 * u * u * (m0 + m1 - 2 * rise)
  return slope * tracyWidomCdf(s) * tracyWidomSurvival(s)
}

/**
 * s with P(s' ≤ s) = p, 0 < p < 1. For p near 1 take `tracyWidomUpper`.
 *
 * @throws RangeError outside
 */
export function tracyWidomQuantile(p: number): number {
  if (!(p > 0 && p < 1)) throw new RangeError(`a probability between 0 and 1 is needed, not ${p}`)
  return whereLogOdds(Math.log(p / (1 - p)))
}

/**
 * s with P(s' > s) = level, 0 < level < 1, exact for small levels too.
 *
 * @throws RangeError outside
 */
export function tracyWidomUpper(level: number): number {
  if (!(level > 0 && level < 1)) throw new RangeError(`a level between 0 and 1 is needed, not ${level}`)
  return whereLogOdds(Math.log((1 - level) / level))
}

function placeOf(s: number): { row: number; u: number } {
  const place = (s - tableStart) / tableStep
  const row = Math.min(lastRow - 1, Math.floor(place))
  return { row, u: place - row }
}

function logOddsAt(s: number): number {
  if (s > tableEnd) return logOdds[lastRow]! + upperTail(s) - upperTail(tableEnd)
  if (s < tableStart) return logOdds[0]! + (tableStart ** 3 - s ** 3) / -24
  const { row, u } = placeOf(s)
  const v = 1 - u
  return (
    v * v * (1 + 2 * u) * logOdds[row]! +
    u * u * (1 + 2 * v) * logOdds[row + 1]! +
    tableStep * u * v * (v * logOddsSlope[row]! - u * logOddsSlope[row + 1]!)
  )
}

/** −ln(1 − F1(s)) for large s but for a constant: 1 − F1 ~ exp(−⅔ s^{3/2})/(4√π s^{3/4}). */
const upperTail = (s: number): number => (2 / 3) * s ** 1.5 + 0.75 * Math.log(s)

function whereLogOdds(wanted: number): number {
  let low = tableStart
  let high = tableEnd
  while (logOddsAt(low) > wanted) low *= 2
  while (logOddsAt(high) < wanted) high *= 2
  while (high - low > 1e-12 * Math.max(1, Math.abs(low))) {
    const middle = (low + high) / 2
    if (logOddsAt(middle) < wanted) low = middle
    else high = middle
  }
  return (low + high) / 2
}
