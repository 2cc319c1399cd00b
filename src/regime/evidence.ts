import type { Measures } from './measures.ts'

export const statisticNames = ['leading-share', 'spectral-distance', 'frobenius', 'partner-distance'] as const
export type StatisticName = (typeof statisticNames)[number]

/** Limits for the statistics named; the others do not count. */
export type ExplicitLimits = Readonly<Partial<Record<StatisticName, number>>>

/** Level at rest and limit of a distance, for `n` signals. */
export interface DistanceLimit {
  readonly rest: number
  readonly limit: number
  /** Mean of the squared distance at rest. */
  readonly meanSquare: number
}

/** What resampling the reference has taught. */
export interface Calibration {
  /** Signals of the reference: distances of noise grow with the square root of their number. */
  readonly n: number
  /** (λ1/λ1⁰)^⅓: where it rests, and how far from there its limit lies on either side; see cubeRoot. */
  readonly share: { readonly centre: number; readonly reach: number }
  readonly distances: Readonly<Record<Exclude<StatisticName, 'leading-share'>, DistanceLimit>>
}

export interface Reading {
  readonly statistic: StatisticName
  /** Leading share: absolute change of λ1/n. Distances: as measured. */
  readonly value: number
  readonly limit: number
  /** 1 exactly at the limit; counted from the level at rest where that is known. */
  readonly ratio: number
}

/** Largest ratio shown: nothing infinite leaves the room. */
const mostRatio = 1e6

/**
 * The statistics against their limits, these `widening` times as far out. An explicit limit takes the place
 * of the learnt one.
 */
export function weigh(
  m: Measures,
  learnt: Calibration | null,
  explicit: ExplicitLimits | null,
  widening = 1,
): readonly Reading[] {
  const readings: Reading[] = []
  const share = shareReading(m, learnt, explicit, widening)
  if (share !== null) readings.push(share)
  const distances = { 'spectral-distance': m.w2, frobenius: m.ceiling, 'partner-distance': m.partners }
  for (const [name, value] of Object.entries(distances)) {
    const statistic = name as keyof typeof distances
    const scale = widening * (learnt === null ? 1 : Math.sqrt(m.n / learnt.n))
    const own = learnt?.distances[statistic]
    const given = explicit?.[statistic]
    const limit = explicit === null ? (own?.limit ?? 0) * scale : (given ?? 0) * widening
    if ((explicit !== null && given === undefined) || (explicit === null && own === undefined)) continue
    const rest = (own?.rest ?? 0) * scale
    const from = rest < limit ? rest : 0
    readings.push({ statistic, value, limit, ratio: ratioOf(value - from, limit - from) })
  }
  return readings
}

function shareReading(
  m: Measures,
  learnt: Calibration | null,
  explicit: ExplicitLimits | null,
  widening: number,
): Reading | null {
  const statistic = 'leading-share'
  const value = Math.abs(m.share - m.shareBefore)
  if (explicit !== null) {
    const given = explicit[statistic]
    if (given === undefined) return null
    const limit = given * widening
    return { statistic, value, limit, ratio: ratioOf(value, limit) }
  }
  if (learnt === null) return null
  const { centre } = learnt.share
  const reach = learnt.share.reach * widening
  const moved = cubeRoot(m) - centre
  const edge = m.shareBefore * Math.max(0, centre + Math.sign(moved || 1) * reach) ** 3
  return { statistic, value, limit: Math.abs(edge - m.shareBefore), ratio: ratioOf(Math.abs(moved), reach) }
}

/**
 * (λ1/λ1⁰)^⅓. A variance is nearly normal on the scale of its cube root, far out too (Wilson & Hilferty 1931),
 * and the leading eigenvalue is the variance along its mode.
 */
export const cubeRoot = (m: Measures): number => Math.cbrt(m.share / Math.max(m.shareBefore, 1e-300))

function ratioOf(value: number, limit: number): number {
  if (!(limit > 0)) return value > 0 ? mostRatio : 0
  return Math.min(mostRatio, Math.max(0, value / limit))
}

/** The reading with the largest ratio; null when nothing has a limit. */
export const strongest = (readings: readonly Reading[]): Reading | null =>
  readings.reduce<Reading | null>((best, r) => (best === null || r.ratio > best.ratio ? r : best), null)
