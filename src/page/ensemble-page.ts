import type { Judged } from '../ensemble.ts'
import type { Shift, State, Transition } from '../regime/regime.ts'
import { figure } from './figures.ts'
import { History, type HistorySize } from './history.ts'
import type { Bar, EnsembleChange, EnsembleNow, EnsembleView, Point, ShiftView } from './view.ts'

/** Names of absent signals that are listed; all are counted. */
const mostAbsent = 20
const mostBars = 10
/** Points that travel one by one; more of them travel as the whole history. */
const mostMore = 60
const pointDigits = 5

/** What the page knows of one ensemble, bounded. */
export class EnsemblePage {
  readonly name: string
  readonly title: string
  readonly #history: History
  #last: Judged | null = null
  #arrived: number | null = null
  #since: number | null = null
  #why: string | null = null
  #shift: Shift | null = null
  #state: State = 'learning'
  #dirty = false

  constructor(name: string, title: string, size: HistorySize) {
    this.name = name
    this.title = title
    this.#history = new History(size)
  }

  get state(): State {
    return this.#state
  }

  get dirty(): boolean {
    return this.#dirty
  }

  judged(judged: Judged): void {
    const { verdict } = judged
    if (this.#last === null && judged.frame === 0) this.#since = judged.time
    this.#last = judged
    this.#arrived = null
    for (const transition of verdict.transitions) this.transition(transition)
    this.#state = verdict.state
    if (verdict.ended !== null && (this.#shift?.number ?? 0) <= verdict.ended) this.#shift = null
    if (verdict.shift !== null) this.#shift = verdict.shift
    this.#history.push(pointOf(judged))
    this.#dirty = true
  }

  transition({ time, to, why }: Transition): void {
    this.#since = time
    this.#why = why
    this.#state = to
    this.#dirty = true
  }

  /** A shift of an earlier run that has not ended. */
  standing(shift: Shift): void {
    if (shift.number < (this.#shift?.number ?? 0)) return
    this.#shift = shift
    this.#dirty = true
  }

  view(now: number): EnsembleView {
    return { ...this.#present(now), history: this.#history.points }
  }

  change(now: number): EnsembleChange {
    this.#dirty = false
    return { present: this.#present(now), ...this.#history.taken(mostMore) }
  }

  #present(now: number): EnsembleNow {
    if (this.#last !== null) this.#arrived ??= now
    const said = {
      name: this.name,
      title: this.title,
      state: this.#state,
      since: this.#since,
      why: this.#why,
      arrived: this.#arrived,
      shift: this.#shift === null || this.#state !== 'shifted' ? null : shiftOf(this.#shift),
    }
    return this.#last === null ? { ...unknown, ...said } : { ...presentOf(this.#last), ...said }
  }
}

type Said = 'name' | 'title' | 'state' | 'since' | 'why' | 'arrived' | 'shift'

const unknown: Omit<EnsembleNow, Said> = {
  learning: null,
  frame: null,
  time: null,
  signals: 0,
  missing: 0,
  absent: [],
  absentCount: 0,
  window: null,
  share: null,
  leading: [],
  edge: null,
  escapes: [],
  distance: null,
  evidence: null,
  statistics: [],
  sight: null,
  certificate: null,
  spectrum: null,
  leaders: [],
}

function presentOf(judged: Judged): Omit<EnsembleNow, Said> {
  const { verdict, bulk, window, spectrum, absent } = judged
  const { distance, evidence } = verdict
  return {
    learning: verdict.learning,
    frame: judged.frame,
    time: judged.time,
    signals: judged.signals,
    missing: judged.missing,
    absent: absent.slice(0, mostAbsent),
    absentCount: absent.length,
    window: { frames: window.frames, effective: figure(window.effective) },
    share: figure(judged.share),
    leading: judged.leading.filter(Number.isFinite).map((value) => figure(value)!),
    edge:
      bulk === null
        ? null
        : {
            model: bulk.model,
            lower: figure(bulk.lower),
            upper: figure(bulk.upper),
            limit: figure(bulk.limit),
            level: figure(bulk.level),
            fit: figure(bulk.fit),
          },
    escapes: (bulk?.escapes ?? [])
      .slice(0, mostBars)
      .map(({ value, signals }) => ({ value: figure(value), signals: figure(signals) })),
    distance:
      distance === null
        ? null
        : {
            w2: figure(distance.w2),
            ceiling: figure(distance.ceiling),
            rotation: figure(distance.rotation),
          },
    evidence: evidence === null ? null : { ...evidence, ratio: figure(evidence.ratio) },
    statistics: Object.entries(verdict.statistics).map(([statistic, ratio]) => ({
      statistic,
      ratio: figure(ratio),
    })),
    sight: figure(verdict.sight),
    certificate: figure(judged.certificate),
    spectrum: spectrum === null ? null : { age: spectrum.age, bound: figure(spectrum.bound) },
    leaders: barsOf(verdict.leaders),
  }
}

function pointOf({ time, share, leading, bulk, verdict }: Judged): Point {
  const short = (value: number | null | undefined) => figure(value, pointDigits)
  return [
    time,
    short(share),
    short(leading[0]),
    short(leading[1]),
    short(bulk?.limit),
    bulk === null ? null : bulk.escapes.length,
    short(verdict.distance?.w2),
    short(verdict.distance?.ceiling),
    short(verdict.evidence?.ratio),
  ]
}

function shiftOf(shift: Shift): ShiftView {
  const carriers = barsOf(shift.carriers)
  const sumOf = (bars: readonly Bar[]) => bars.reduce((sum, { share }) => sum + share, 0)
  return {
    number: shift.number,
    kind: shift.kind,
    start: shift.start,
    startFrom: shift.startFrom,
    startTo: shift.startTo,
    confirmed: shift.confirmed,
    carriers,
    remainder: figure(shift.remainder + sumOf(shift.carriers) - sumOf(carriers), 4),
  }
}

/** The largest by size, at most ten; a share that is not finite is left out. */
const barsOf = (bars: readonly Bar[]): readonly Bar[] =>
  bars
    .filter(({ share }) => Number.isFinite(share))
    .map(({ signal, share }) => ({ signal, share: figure(share, 4)! }))
    .sort((a, b) => Math.abs(b.share) - Math.abs(a.share))
    .slice(0, mostBars)
