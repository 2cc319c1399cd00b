import {
  ArrivalQueue,
  type DemoChunk,
  type DemoClock,
  defaultClock,
  type PlantedEvent,
  roundFrames,
  underWay,
} from './demo-feed.ts'
import { Random } from './random.ts'

/** Part of the invented pumping station to which a transmitter belongs. */
type Part = 'pump-a' | 'pump-b' | 'header' | 'cooling' | 'exchanger'

interface Transmitter {
  readonly tag: string
  readonly part: Part
  /** Value at rest, in the unit of the transmitter. */
  readonly rest: number
  /** Standard deviation of its movements, same unit. */
  readonly span: number
  /** Which way it moves with its part. */
  readonly sign: 1 | -1
}

const transmitters = (part: Part, list: readonly (readonly [string, number, number, 1 | -1])[]) =>
  list.map(([tag, rest, span, sign]): Transmitter => ({ tag, part, rest, span, sign }))

/** 36 invented transmitters: pressures in bar, flows in m³/h, temperatures in °C, vibration in mm/s, levels in m, power in kW. */
const plant: readonly Transmitter[] = [
  ...transmitters('pump-a', [
    ['PT-101', 6.2, 0.08, 1],
    ['PT-102', 1.4, 0.03, -1],
    ['FT-201', 420, 6, 1],
    ['TT-301', 58, 0.4, 1],
    ['VT-401', 2.1, 0.06, 1],
    ['VT-402', 1.8, 0.05, 1],
    ['JT-601', 96, 1.2, 1],
  ]),
  ...transmitters('header', [
    ['PT-103', 5.8, 0.06, -1],
    ['PT-104', 5.7, 0.06, -1],
    ['PT-105', 5.1, 0.07, -1],
    ['PT-106', 4.8, 0.07, -1],
    ['FT-203', 180, 4, 1],
    ['FT-204', 145, 3.5, 1],
    ['FT-205', 62, 2, 1],
    ['FT-206', 33, 1.2, 1],
    ['LT-501', 3.6, 0.02, -1],
    ['LT-502', 2.9, 0.02, -1],
  ]),
  ...transmitters('pump-b', [
    ['PT-107', 6.2, 0.08, 1],
    ['PT-108', 1.4, 0.03, -1],
    ['FT-202', 415, 6, 1],
    ['TT-302', 57, 0.4, 1],
    ['VT-403', 2.3, 0.06, 1],
    ['VT-404', 1.9, 0.05, 1],
    ['JT-602', 95, 1.2, 1],
  ]),
  ...transmitters('cooling', [
    ['TT-303', 18, 0.15, 1],
    ['TT-304', 26, 0.2, 1],
    ['LT-503', 1.2, 0.01, -1],
    ['JT-603', 11, 0.3, 1],
  ]),
  ...transmitters('exchanger', [
    ['PT-109', 3.4, 0.04, 1],
    ['PT-110', 2.9, 0.04, -1],
    ['FT-207', 74, 1.5, 1],
    ['FT-208', 69, 1.4, 1],
    ['TT-305', 71, 0.5, 1],
    ['TT-306', 49, 0.4, -1],
    ['TT-307', 31, 0.3, 1],
    ['TT-308', 44, 0.4, 1],
  ]),
]

export const stationSignals: readonly string[] = plant.map(({ tag }) => tag)
export const stationParts: Readonly<Record<string, readonly string[]>> = Object.fromEntries(
  ['pump-a', 'pump-b', 'header', 'cooling', 'exchanger'].map((part) => [
    part,
    plant.filter((transmitter) => transmitter.part === part).map(({ tag }) => tag),
  ]),
)

/** Lag-1 coefficients, a frame apart, of what the whole plant and its parts do. */
const factorMemory = { demand: 0.6, 'pump-a': 0.5, 'pump-b': 0.5, cooling: 0.55, exchanger: 0.55 } as const
type Factor = keyof typeof factorMemory

/** Frames that a change-over takes. */
const changeOverFrames = 12
/** How far a pump's transmitters stand from their running values when it is at rest, in spans. */
const idleDistance = 8

/** The planted events of the station, for so many rounds of 5,400 frames. */
export function stationEvents(rounds = 1): PlantedEvent[] {
  const one: PlantedEvent[] = [
    {
      ensemble: 'station',
      what: 'stuck',
      from: 700,
      to: 1300,
      expected: 'finding',
      kind: null,
      finding: 'stuck',
      signals: ['PT-103'],
      sentence: 'PT-103 sticks at one value: a finding about one transmitter, no change of regime.',
    },
    {
      ensemble: 'station',
      what: 'fouling',
      from: 1800,
      to: 3900,
      expected: 'shift',
      kind: 'strength',
      finding: null,
      signals: stationParts.exchanger!,
      sentence: 'The heat exchanger fouls: over 600 frames its transmitters cease to move together.',
    },
    {
      ensemble: 'station',
      what: 'change-over',
      from: 3900,
      to: null,
      expected: 'planned',
      kind: null,
      finding: null,
      signals: [...stationParts['pump-a']!, ...stationParts['pump-b']!],
      sentence:
        'Planned: the other pump takes over and the exchanger is cleaned. A new reference is learnt, nobody is paged.',
    },
  ]
  return Array.from({ length: rounds }, (_, round) => round * roundFrames).flatMap((shift) =>
    one.map((event) => ({
      ...event,
      from: event.from + shift,
      to: event.to === null ? null : event.to + shift,
    })),
  )
}

/** Share of the load that pump B carries in a frame, from 0 to 1: it changes at every change-over. */
function loadOfB(events: readonly PlantedEvent[], frame: number): number {
  let load = 0
  for (const { what, from } of events) {
    if (what !== 'change-over' || from > frame) continue
    const done = Math.min(1, (frame - from + 1) / changeOverFrames)
    load += load === 0 ? done : -done
  }
  return load
}

/** How clean the exchanger is in a frame: 1, falling to 0 over the first 600 frames of a fouling. */
const cleanness = (fouling: PlantedEvent | undefined, frame: number): number =>
  fouling ? Math.max(0, 1 - (frame - fouling.from) / 600) : 1

/**
 * Readings of the invented pumping station, one chunk a frame: every transmitter is scanned once a frame at
 * its own moment (flows twice), everything remembers (AR(1)), demand, the two pumps, cooling water and the
 * exchanger move their transmitters together, 0.3 % of the readings are lost and 2 % come late.
 */
export function* stationReadings(
  options: Partial<DemoClock> = {},
  events: readonly PlantedEvent[] = stationEvents(),
): Generator<DemoChunk> {
  const { seed, start, stepMs, frames, latenessMs } = { ...defaultClock, ...options }
  const random = new Random(seed ^ 0x5eed)
  const n = plant.length
  const fill = (one: () => number) => Float64Array.from({ length: n }, one)
  const phase = fill(() => 0.05 + 0.35 * random.uniform())
  const ownMemory = fill(() => 0.35 + 0.2 * random.uniform())
  const own = fill(() => random.normal())
  const factors: Record<Factor, number> = { demand: 0, 'pump-a': 0, 'pump-b': 0, cooling: 0, exchanger: 0 }
  const held = new Float64Array(n).fill(Number.NaN)
  const queue = new ArrivalQueue(stationSignals)
  const dayFrames = 86_400_000 / stepMs

  const scan = (i: number, at: number, value: number) => {
    if (random.uniform() < 0.003) return
    const time = Math.floor(at + 0.02 * stepMs * random.uniform())
    const late = random.uniform() < 0.02 ? Math.floor(random.uniform() * latenessMs * 0.95) : 0
    // A transmitter resolves a fiftieth of its span.
    const step = plant[i]!.span / 50
    queue.put(i, time, Number((Math.round(value / step) * step).toPrecision(8)), time + late)
  }

  for (let frame = 0; frame < frames; frame++) {
    const open = start + frame * stepMs
    for (const name of Object.keys(factors) as Factor[]) {
      const memory = factorMemory[name]
      factors[name] = memory * factors[name] + Math.sqrt(1 - memory ** 2) * random.normal()
    }
    const day = 0.3 * Math.sin((2 * Math.PI * frame) / dayFrames)
    const b = loadOfB(events, frame)
    const clean = cleanness(underWay(events, 'fouling', frame), frame)
    const stuck = underWay(events, 'stuck', frame)?.signals ?? []
    for (let i = 0; i < n; i++) {
      const { tag, part, rest, span, sign } = plant[i]!
      own[i] = ownMemory[i]! * own[i]! + Math.sqrt(1 - ownMemory[i]! ** 2) * random.normal()
      const load = part === 'pump-a' ? 1 - b : part === 'pump-b' ? b : 1
      const movement = day + moves(part, factors, own[i]!, load, clean)
      const value = rest + span * sign * (movement - (1 - load) * idleDistance)
      if (stuck.includes(tag)) held[i] = Number.isNaN(held[i]!) ? value : held[i]!
      else held[i] = Number.NaN
      const shown = Number.isNaN(held[i]!) ? value : held[i]!
      scan(i, open + phase[i]! * stepMs, shown)
      if (tag.startsWith('FT')) scan(i, open + (phase[i]! + 0.5) * stepMs, shown)
    }
    yield queue.take(frame, open + stepMs)
  }
}

/** Movement of a transmitter in spans: variance 1 while its part runs. */
function moves(
  part: Part,
  factors: Readonly<Record<Factor, number>>,
  own: number,
  load: number,
  clean: number,
): number {
  const { demand, cooling, exchanger } = factors
  switch (part) {
    case 'header':
      return Math.sqrt(0.65) * demand + Math.sqrt(0.35) * own
    case 'cooling':
      return Math.sqrt(0.6) * cooling + Math.sqrt(0.1) * demand + Math.sqrt(0.3) * own
    case 'exchanger':
      return (
        Math.sqrt(0.6) * clean * exchanger +
        Math.sqrt(0.15) * cooling +
        Math.sqrt(0.25 + 0.6 * (1 - clean ** 2)) * own
      )
    default: {
      const running = Math.sqrt(0.4) * factors[part] + Math.sqrt(0.3) * demand + Math.sqrt(0.3) * own
      return load * running + (1 - load) * 0.3 * own
    }
  }
}
