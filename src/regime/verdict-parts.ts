import { type Reading, strongest } from './evidence.ts'
import { type Measures, rotationShare } from './measures.ts'
import type { Carrier, Observation, Verdict } from './regime.ts'

const mostLeaders = 10

/** What a verdict shows of a frame's figures. `since`: when the evidence left its rest. */
export function shown(
  o: Observation,
  m: Measures | null,
  readings: readonly Reading[],
  since: number | null,
): Pick<Verdict, 'distance' | 'evidence' | 'statistics' | 'sight' | 'leaders'> {
  const top = strongest(readings)
  return {
    distance: m === null ? null : { w2: m.w2, ceiling: m.ceiling, rotation: rotationShare(m.w2, m.ceiling) },
    evidence: top === null ? null : { ratio: top.ratio, statistic: top.statistic, since },
    statistics: Object.fromEntries(readings.map((r) => [r.statistic, r.ratio])),
    sight: o.active.length > 0 && o.window.effective > 0 ? sightOf(o) : null,
    leaders: leadersOf(o),
  }
}

/** 1 + √q: the smallest population eigenvalue, in units of the noise, that stands out (Baik, Ben Arous & Péché 2005). */
export const sightOf = (o: Observation): number => 1 + Math.sqrt(o.active.length / o.window.effective)

function leadersOf({ spectrum, active, names }: Observation): Carrier[] {
  if (spectrum === null || spectrum.modes < 1) return []
  const { vectors } = spectrum
  const places: number[] = []
  for (let a = 0; a < active.length; a++) {
    const size = Math.abs(vectors[a]!)
    if (places.length === mostLeaders && size <= Math.abs(vectors[places[mostLeaders - 1]!]!)) continue
    let at = places.length === mostLeaders ? mostLeaders - 1 : places.length
    for (; at > 0 && Math.abs(vectors[places[at - 1]!]!) < size; at--) places[at] = places[at - 1]!
    places[at] = a
  }
  return places.map((a) => ({
    signal: names[active[a]!] ?? `#${active[a]!}`,
    share: vectors[a]! * vectors[a]!,
  }))
}

export const percent = (ratio: number): string => `${Math.round(100 * Math.min(ratio, 1e4))} %`

export const sentence = (words: string): string => words.charAt(0).toUpperCase() + words.slice(1)
