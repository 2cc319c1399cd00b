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

/** The four sectors of the invented desk, twelve invented instruments each. */
export const deskSectors: Readonly<Record<string, readonly string[]>> = {
  shore: 'QUAY SKERN HOLMA VADLE NESBY STRAYE BRIGGE FJARE TANGEN ODDEN SUNDE REVLE'.split(' '),
  fell: 'FELL TARN BECKE GHYLL RIGGEN KNOTTE SCARRE PIKKEN HAUSE DODDEN CRAGGE NABBEN'.split(' '),
  wood: 'ALDRE ROWEN BIRKEN HASLE OSPEN LIMBEN EIKEN BOKEN SELJE HEGGEN FURUA LOVEN'.split(' '),
  mill: 'MYLNE KVERN DAMMEN SLUSE HJULE RENNEN AKSLEN TANNEN LAGRET SPILEN KRAGEN VASSLE'.split(' '),
}

/** Names of the 48 instruments, sector by sector. */
export const deskSignals: readonly string[] = Object.values(deskSectors).flat()

/** Shares of an instrument's variance in calm times; the rest is its own. */
const calm = { market: 0.25, sector: 0.22 }
/** Share of the market while its mode spikes; sector and own part shrink alike to make room. */
const spikeMarket = 0.55
const sectors = 4
/** Latent prices move so many times a frame. */
const movesPerFrame = 5
const burstFactor = 3

/** The planted events of the desk, for so many rounds of 5,400 frames. */
export function deskEvents(rounds = 1): PlantedEvent[] {
  const one: PlantedEvent[] = [
    {
      ensemble: 'desk',
      what: 'flash-print',
      from: 420,
      to: 421,
      expected: 'nothing',
      kind: null,
      finding: null,
      signals: ['TARN'],
      sentence: 'One print of TARN, far off its price: a bad tick, no change of regime.',
    },
    {
      ensemble: 'desk',
      what: 'volatility-burst',
      from: 560,
      to: 660,
      expected: 'nothing',
      kind: null,
      finding: null,
      signals: [],
      sentence: 'All instruments move three times as much, but together as before: no change of regime.',
    },
    {
      ensemble: 'desk',
      what: 'lull',
      from: 900,
      to: 1080,
      expected: 'nothing',
      kind: null,
      finding: null,
      signals: [],
      sentence: 'Lunch: everything trades less often.',
    },
    {
      ensemble: 'desk',
      what: 'market-mode-spike',
      from: 1500,
      to: 2400,
      expected: 'shift',
      kind: 'strength',
      finding: null,
      signals: [],
      sentence: 'The market mode takes 55 % of the variance instead of 25 %: everything moves as one.',
    },
    {
      ensemble: 'desk',
      what: 'rotation',
      from: 3900,
      to: null,
      expected: 'shift',
      kind: 'partners',
      finding: null,
      signals: [],
      sentence: 'Other instruments move together, as strongly as before: the partners have rotated.',
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

/** Sector of instrument i after so many rotations: each new sector takes three of every old one. */
const sectorOf = (i: number, rotations: number): number =>
  rotations % 2 === 0 ? Math.floor(i / (deskSignals.length / sectors)) : i % sectors

/** How busy trading is in a frame, 1 in the open: falls to 0.55 and comes back in the lull. */
function activity(lull: PlantedEvent | undefined, frame: number): number {
  if (!lull) return 1
  const span = lull.to! - lull.from
  const ramp = Math.min(1, (Math.min(frame - lull.from + 1, lull.to! - frame) * 6) / span)
  return 1 - 0.45 * ramp
}

/**
 * Trades of the invented desk, one chunk a frame: asynchronous Poisson ticks at log-normally spread rates,
 * t₄ returns of a market, four sectors and each instrument, common stochastic volatility, prints half a
 * spread above or below, and the planted events. 3 % of the readings come late, inside the lateness.
 */
export function* deskReadings(
  options: Partial<DemoClock> = {},
  events: readonly PlantedEvent[] = deskEvents(),
): Generator<DemoChunk> {
  const { seed, start, stepMs, frames, latenessMs } = { ...defaultClock, ...options }
  const random = new Random(seed)
  const n = deskSignals.length
  const fill = (one: (i: number) => number) => Float64Array.from({ length: n }, (_, i) => one(i))
  /** Ticks a millisecond: median 1.2 in 1 s at a step of 5 s, six a frame. */
  const rate = fill(() => (6 / stepMs) * Math.exp(0.4 * random.normal()))
  /** Standard deviation of the log-return of a frame. */
  const sigma = fill(() => 4e-4 * Math.exp(0.3 * random.normal()))
  const halfSpread = sigma.map((s) => 0.12 * s)
  const firstPrice = fill(() => Math.exp(4 + 0.6 * random.normal()))
  const beta = fill(() => Math.sqrt(0.8 + 0.4 * random.uniform()))
  const logPrice = new Float64Array(n)
  const lastTime = new Float64Array(n).fill(Number.NEGATIVE_INFINITY)
  const nextTick = fill((i) => start + random.exponential() / rate[i]!)
  const queue = new ArrivalQueue(deskSignals)
  const sectorReturn = new Float64Array(sectors)
  let logVolatility = 0

  const delay = () => (random.uniform() < 0.03 ? Math.floor(random.uniform() * latenessMs * 0.95) : 0)
  const print = (i: number, at: number, price: number, late: number) => {
    const time = Math.max(Math.floor(at), lastTime[i]! + 1)
    lastTime[i] = time
    queue.put(i, time, Math.round(price * 1000) / 1000, time + late)
  }

  for (let frame = 0; frame < frames; frame++) {
    const open = start + frame * stepMs
    // Common volatility: AR(1) of the logarithm, memory of about 30 frames, standard deviation 0.25.
    logVolatility = 0.97 * logVolatility + Math.sqrt(1 - 0.97 ** 2) * 0.25 * random.normal()
    const busy = activity(underWay(events, 'lull', frame), frame)
    const burst = underWay(events, 'volatility-burst', frame) ? burstFactor : 1
    const amplitude = Math.exp(logVolatility) * burst * Math.sqrt(busy / movesPerFrame)
    const marketShare = underWay(events, 'market-mode-spike', frame) ? spikeMarket : calm.market
    const room = (1 - marketShare) / (1 - calm.market)
    const rotations = events.filter((event) => event.what === 'rotation' && event.from <= frame).length
    const flash = underWay(events, 'flash-print', frame)

    for (let move = 0; move < movesPerFrame; move++) {
      const end = open + ((move + 1) * stepMs) / movesPerFrame
      const market = random.fatTailed()
      for (let g = 0; g < sectors; g++) sectorReturn[g] = random.fatTailed()
      for (let i = 0; i < n; i++) {
        const toMarket = marketShare * beta[i]! ** 2
        const toSector = calm.sector * room
        const own = Math.sqrt(1 - toMarket - toSector) * random.fatTailed()
        const partners = Math.sqrt(toSector) * sectorReturn[sectorOf(i, rotations)]!
        logPrice[i]! += sigma[i]! * amplitude * (Math.sqrt(toMarket) * market + partners + own)
        while (nextTick[i]! < end) {
          const side = random.bits() & 1 ? halfSpread[i]! : -halfSpread[i]!
          print(i, nextTick[i]!, firstPrice[i]! * Math.exp(logPrice[i]! + side), delay())
          nextTick[i]! += random.exponential() / (rate[i]! * busy)
        }
      }
    }
    for (const name of flash?.signals ?? []) {
      const i = deskSignals.indexOf(name)
      print(i, open + stepMs - 1, firstPrice[i]! * Math.exp(logPrice[i]!) * 0.88, 0)
    }
    yield queue.take(frame, open + stepMs)
  }
}
