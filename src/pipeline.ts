import { concatMap, endWith, map, merge, type Observable, of, takeUntil, takeWhile } from 'rxjs'
import type { Ensemble, Judged } from './ensemble.ts'
import type { Feed, FeedEvent, QuarantinedRecord, ReadingBatch } from './feeds/feed.ts'
import type { Finding, Frame } from './frames/frame.ts'
import { addDrops, type DropCounts } from './reasons.ts'

/** What enters the stream: an event of a feed, or the beat of the clock. */
export type Arrival =
  | { readonly feed: Feed; readonly event: FeedEvent }
  | { readonly feed: null; readonly event: { readonly type: 'beat' } }

/** The frames of one ensemble that one arrival has closed, and what was noticed on the way. */
interface Closed {
  readonly ensemble: Ensemble
  readonly frames: readonly Frame[]
  readonly findings: readonly Finding[]
}

interface Framed {
  readonly arrival: Arrival
  readonly closed: readonly Closed[]
  readonly dropped: DropCounts
}

/** What came of one arrival: it travels to the sinks as one value and is acknowledged behind the last. */
export interface Outcome {
  readonly arrival: Arrival
  readonly judged: readonly Judged[]
  readonly findings: readonly { readonly ensemble: string; readonly finding: Finding }[]
  readonly dropped: DropCounts
  readonly quarantined: readonly QuarantinedRecord[]
}

/** The clock and the scheduler that the house is driven by; tests bring their own. */
export interface Drive {
  /** Milliseconds since 1970 UTC. */
  now(): number
  /** Milliseconds of a clock that never steps, for durations. */
  lap(): number
  /** Gives way to the event loop. */
  breathe(): Promise<void>
  /** Beats while the stream is subscribed; an empty stream when there is nothing to keep time for. */
  readonly beats: Observable<unknown>
}

export interface Pipeline {
  readonly feeds: readonly Feed[]
  readonly ensembles: readonly Ensemble[]
  readonly drive: Drive
  /** Longest stretch of computing between two breaths of the event loop, in milliseconds. */
  readonly sliceMs: number
  /** Emits when no more is to be taken in; what is in hand is carried to its end. */
  readonly stop: Observable<unknown>
  /** Raises alerts and makes the outcome's effects durable; resolves when that is done. */
  effects(outcome: Outcome): void | Promise<void>
}

/**
 * The way through the house: readings ▶ frames ▶ window ▶ spectrum ▶ bulk ▶ regime ▶ alerts. Each source
 * has one batch in flight; it is acknowledged behind the last effect, and only then the feed reads on. One
 * arrival is under way at a time: behind its effects the state of the house is that of all arrivals so far.
 */
export function pipeline(parts: Pipeline): Observable<Outcome> {
  const { feeds, drive } = parts
  const arrivals = feeds.map((feed) => feed.events.pipe(map((event): Arrival => ({ feed, event }))))
  const beats = drive.beats.pipe(map((): Arrival => ({ feed: null, event: { type: 'beat' } })))
  return whileFeedsLast(merge(...arrivals), beats).pipe(
    takeUntil(parts.stop),
    concatMap((arrival) =>
      of(arrival).pipe(
        map((arrival) => intoFrames(parts, arrival)),
        concatMap((framed) => intoVerdicts(parts, framed)),
        concatMap((outcome) => intoEffects(parts, outcome)),
        map(acknowledge),
      ),
    ),
  )
}

/** The beats stop when the last feed has ended. */
function whileFeedsLast(arrivals: Observable<Arrival>, beats: Observable<Arrival>): Observable<Arrival> {
  return merge(arrivals.pipe(endWith(null)), beats).pipe(takeWhile((arrival) => arrival !== null))
}

function intoFrames(parts: Pipeline, arrival: Arrival): Framed {
  const now = parts.drive.now()
  const closed: Closed[] = []
  let dropped: DropCounts = arrival.event.type === 'batch' ? arrival.event.batch.dropped : {}
  for (const ensemble of parts.ensembles) {
    if (arrival.feed !== null && !ensemble.drawsFrom(arrival.feed.name)) continue
    const taken =
      arrival.feed === null ? ensemble.beat(now) : ensemble.take(arrival.feed.name, arrival.event, now)
    dropped = addDrops(dropped, taken.dropped)
    closed.push({ ensemble, frames: taken.frames, findings: taken.findings })
  }
  if (arrival.event.type === 'batch' && arrival.feed !== null) {
    const unwatched = countUnwatched(parts.ensembles, arrival.feed.name, arrival.event.batch)
    if (unwatched > 0) dropped = addDrops(dropped, { 'unknown-signal': unwatched })
  }
  keepAbreast(parts, now)
  return { arrival, closed, dropped }
}

async function intoVerdicts(parts: Pipeline, framed: Framed): Promise<Outcome> {
  const { drive, sliceMs } = parts
  const judged: Judged[] = []
  let sliceStart = drive.lap()
  for (const { ensemble, frames } of framed.closed) {
    for (const frame of frames) {
      judged.push(ensemble.judge(frame, drive.lap))
      if (drive.lap() - sliceStart > sliceMs) {
        await drive.breathe()
        sliceStart = drive.lap()
      }
    }
  }
  return {
    arrival: framed.arrival,
    judged,
    findings: framed.closed.flatMap(({ ensemble, findings }) =>
      findings.map((finding) => ({ ensemble: ensemble.name, finding })),
    ),
    dropped: framed.dropped,
    quarantined: framed.arrival.event.type === 'batch' ? framed.arrival.event.quarantined : [],
  }
}

async function intoEffects(parts: Pipeline, outcome: Outcome): Promise<Outcome> {
  await parts.effects(outcome)
  return outcome
}

function acknowledge(outcome: Outcome): Outcome {
  if (outcome.arrival.event.type === 'batch') outcome.arrival.event.done()
  return outcome
}

/** Holds the sources whose event time runs far ahead of the slowest one's, so that what waits stays bounded. */
function keepAbreast(parts: Pipeline, now: number): void {
  for (const feed of parts.feeds) {
    const ahead = new Set<string>()
    const all = new Set<string>()
    for (const ensemble of parts.ensembles) {
      if (!ensemble.drawsFrom(feed.name)) continue
      for (const [source, isAhead] of ensemble.leads(feed.name, now)) {
        all.add(source)
        if (isAhead) ahead.add(source)
      }
    }
    for (const source of all) feed.hold(source, ahead.has(source))
  }
}

/** For each list of names a feed shows: which of them some ensemble watches. */
const watchedNames = new WeakMap<readonly string[], boolean[]>()

/** Readings of signals that no ensemble of the feed watches. */
function countUnwatched(ensembles: readonly Ensemble[], feed: string, batch: ReadingBatch): number {
  const { names, count, signal } = batch
  let watched = watchedNames.get(names)
  if (watched === undefined) {
    watched = []
    watchedNames.set(names, watched)
  }
  const known = watched.length
  for (let id = known; id < names.length; id++) {
    const name = names[id]!
    watched.push(ensembles.some((ensemble) => ensemble.drawsFrom(feed) && ensemble.watches(name)))
  }
  if (watched.every(Boolean)) return 0
  let unwatched = 0
  for (let r = 0; r < count; r++) if (watched[signal[r]!] === false) unwatched++
  return unwatched
}
