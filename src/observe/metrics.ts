import { Counter, collectDefaultMetrics, Gauge, Histogram, Registry } from 'prom-client'
import type { Judged, Step } from '../ensemble.ts'
import { type SignalCondition, signalConditions } from '../frames/hygiene.ts'
import { type DropCounts, type DropReason, dropReasons } from '../reasons.ts'
import { shiftKinds, states } from '../regime/regime.ts'

const prefix = 'tautline_'
/** Signals of an ensemble that the table of carriers names at most. */
const mostCarriers = 10

/**
 * The monitor's own metrics in a registry of their own, base units throughout. No label takes a signal's
 * name but in the bounded table of the present carriers.
 */
export class Metrics {
  readonly registry = new Registry()
  readonly #readings = this.#counter('readings_total', 'Readings taken from a feed, dropped ones included.', [
    'feed',
  ])
  readonly #dropped = this.#counter('readings_dropped_total', 'Readings and records dropped, by reason.', [
    'feed',
    'reason',
  ])
  readonly #frames = this.#counter('frames_total', 'Frames closed and judged.', ['ensemble'])
  readonly #delay = this.#histogram(
    'frame_delay_seconds',
    'From the end of a frame in event time to its verdict.',
    ['ensemble'],
    [0.01, 0.05, 0.1, 0.25, 0.5, 1, 2.5, 5, 10, 30, 60, 300, 3600],
  )
  readonly #compute = this.#histogram(
    'frame_compute_seconds',
    'Computing time of a frame, by step.',
    ['ensemble', 'step'],
    [1e-5, 3e-5, 1e-4, 3e-4, 1e-3, 3e-3, 1e-2, 3e-2, 0.1, 0.3, 1],
  )
  readonly #last = this.#gauge('last_frame_timestamp_seconds', 'End of the last judged frame, Unix time.', [
    'ensemble',
  ])
  readonly #behind = this.#gauge('feed_behind_messages', 'Messages (files: bytes) still to be read.', [
    'feed',
  ])
  readonly #signals = this.#gauge(
    'signals',
    'Signals of an ensemble by condition; each signal counts once.',
    ['ensemble', 'condition'],
  )
  readonly #window = this.#gauge('window_frames', 'Frames in the window.', ['ensemble'])
  readonly #share = this.#gauge('leading_eigenvalue_share_ratio', 'Leading eigenvalue over the trace.', [
    'ensemble',
  ])
  readonly #edge = this.#gauge('bulk_edge', 'Edges of the fitted bulk.', ['ensemble', 'side'])
  readonly #fit = this.#gauge('bulk_fit_distance', 'Kolmogorov-Smirnov distance of the bulk to its law.', [
    'ensemble',
  ])
  readonly #escapes = this.#gauge('escapes', 'Eigenvalues beyond the edge at the stated level.', ['ensemble'])
  readonly #distance = this.#gauge(
    'spectral_distance',
    'W2 between the spectra of the window and the reference.',
    ['ensemble'],
  )
  readonly #ceiling = this.#gauge(
    'spectral_distance_ceiling',
    'Hoffman-Wielandt ceiling of the spectral distance.',
    ['ensemble'],
  )
  readonly #rotation = this.#gauge(
    'rotation_share_ratio',
    'Part of the change that moved partners and not strength.',
    ['ensemble'],
  )
  readonly #evidence = this.#gauge('evidence_ratio', 'Evidence of a statistic over its limit.', [
    'ensemble',
    'statistic',
  ])
  readonly #certificate = this.#gauge(
    'truncation_certificate',
    'What truncation can have moved the spectrum by, at most.',
    ['ensemble'],
  )
  readonly #sight = this.#gauge(
    'sight_limit',
    'Smallest population eigenvalue that can be seen, over the noise variance.',
    ['ensemble'],
  )
  readonly #state = this.#gauge('regime_state', 'The state of the ensemble: 1 for the present one.', [
    'ensemble',
    'state',
  ])
  readonly #shifts = this.#counter('regime_shifts_total', 'Confirmed shifts, by kind.', ['ensemble', 'kind'])
  readonly #carriers = this.#gauge('carrier_share_ratio', 'Shares of the present carriers, ten at most.', [
    'ensemble',
    'signal',
  ])
  readonly #waiting = this.#gauge('alerts_waiting', 'Deliveries of alerts that wait in the outbox.', [])
  readonly #deliveries = this.#counter('alert_deliveries_total', 'Tries to deliver, by route and outcome.', [
    'route',
    'outcome',
  ])
  readonly #checkpoint = this.#gauge('checkpoint_age_seconds', 'Since the last checkpoint was durable.', [])
  readonly #build = this.#gauge('build_info', 'Version of the monitor; always 1.', ['version', 'node'])
  readonly #named = new Map<string, Set<string>>()
  readonly #weighed = new Map<string, readonly string[]>()
  readonly #process = processRegistry()

  constructor(version: string) {
    this.#build.set({ version, node: process.version }, 1)
    this.#waiting.set(0)
  }

  /** Makes every series of a feed exist from the start, so that rates see their first rise. */
  openFeed(feed: string): void {
    this.#readings.inc({ feed }, 0)
    for (const reason of Object.keys(dropReasons)) this.#dropped.inc({ feed, reason }, 0)
    this.#behind.set({ feed }, 0)
  }

  openEnsemble(ensemble: string): void {
    this.#frames.inc({ ensemble }, 0)
    for (const kind of shiftKinds) this.#shifts.inc({ ensemble, kind }, 0)
    for (const state of states) this.#state.set({ ensemble, state }, state === 'learning' ? 1 : 0)
  }

  openRoute(route: string): void {
    for (const outcome of ['delivered', 'failed', 'given-up']) this.#deliveries.inc({ route, outcome }, 0)
  }

  readings(feed: string, count: number): void {
    this.#readings.inc({ feed }, count)
  }

  dropped(feed: string, counts: DropCounts): void {
    for (const [reason, count] of Object.entries(counts) as [DropReason, number][]) {
      this.#dropped.inc({ feed, reason }, count)
    }
  }

  behind(feed: string, messages: number): void {
    this.#behind.set({ feed }, messages)
  }

  /** What is not known, or not finite, has no series until it is known. `now` in milliseconds since 1970 UTC. */
  judged(judged: Judged, now: number): void {
    const { ensemble, verdict, bulk } = judged
    const { distance } = verdict
    this.#frames.inc({ ensemble })
    this.#delay.observe({ ensemble }, Math.max(0, now - judged.time) / 1000)
    for (const [step, ms] of Object.entries(judged.spent) as [Step, number][]) {
      this.#compute.observe({ ensemble, step }, ms / 1000)
    }
    this.#last.set({ ensemble }, judged.time / 1000)
    this.#window.set({ ensemble }, judged.window.frames)
    show(this.#escapes, { ensemble }, bulk?.escapes.length)
    show(this.#share, { ensemble }, judged.share)
    show(this.#certificate, { ensemble }, judged.certificate)
    show(this.#sight, { ensemble }, verdict.sight)
    show(this.#fit, { ensemble }, bulk?.fit)
    show(this.#edge, { ensemble, side: 'lower' }, bulk?.lower)
    show(this.#edge, { ensemble, side: 'upper' }, bulk?.upper)
    show(this.#distance, { ensemble }, distance?.w2)
    show(this.#ceiling, { ensemble }, distance?.ceiling)
    show(this.#rotation, { ensemble }, distance?.rotation)
    this.#weigh(ensemble, verdict.statistics)
    for (const state of states) this.#state.set({ ensemble, state }, state === verdict.state ? 1 : 0)
    if (verdict.shift !== null) this.#shifts.inc({ ensemble, kind: verdict.shift.kind })
  }

  /** Evidence that is not weighed at present leaves the table. */
  #weigh(ensemble: string, ratios: Readonly<Record<string, number>>): void {
    for (const statistic of this.#weighed.get(ensemble) ?? []) {
      if (!(statistic in ratios)) this.#evidence.remove({ ensemble, statistic })
    }
    for (const [statistic, ratio] of Object.entries(ratios))
      show(this.#evidence, { ensemble, statistic }, ratio)
    this.#weighed.set(ensemble, Object.keys(ratios))
  }

  conditions(ensemble: string, counts: Readonly<Record<SignalCondition, number>>): void {
    for (const condition of signalConditions) this.#signals.set({ ensemble, condition }, counts[condition])
  }

  /** The signals that carry the present leading mode; those that no longer do leave the table. */
  carriers(ensemble: string, shares: readonly { readonly signal: string; readonly share: number }[]): void {
    const named = new Set(shares.slice(0, mostCarriers).map(({ signal }) => signal))
    for (const signal of this.#named.get(ensemble) ?? []) {
      if (!named.has(signal)) this.#carriers.remove({ ensemble, signal })
    }
    for (const { signal, share } of shares.slice(0, mostCarriers))
      this.#carriers.set({ ensemble, signal }, share)
    this.#named.set(ensemble, named)
  }

  waiting(deliveries: number): void {
    this.#waiting.set(deliveries)
  }

  delivery(route: string, outcome: 'delivered' | 'failed' | 'given-up'): void {
    this.#deliveries.inc({ route, outcome })
  }

  checkpointAge(seconds: number): void {
    this.#checkpoint.set(seconds)
  }

  async text(): Promise<{ readonly contentType: string; readonly body: string }> {
    const [own, process] = await Promise.all([this.registry.metrics(), this.#process.metrics()])
    return { contentType: this.registry.contentType, body: `${own.trimEnd()}\n${process}` }
  }

  #counter(name: string, help: string, labelNames: string[]): Counter {
    return new Counter({ name: prefix + name, help, labelNames, registers: [this.registry] })
  }

  #gauge(name: string, help: string, labelNames: string[]): Gauge {
    return new Gauge({ name: prefix + name, help, labelNames, registers: [this.registry] })
  }

  #histogram(name: string, help: string, labelNames: string[], buckets: number[]): Histogram {
    return new Histogram({ name: prefix + name, help, labelNames, buckets, registers: [this.registry] })
  }
}

function show(gauge: Gauge, labels: Record<string, string>, value: number | null | undefined): void {
  if (typeof value === 'number' && Number.isFinite(value)) gauge.set(labels, value)
  else gauge.remove(labels)
}

/**
 * Memory, processor time and file handles of the process under their usual names. The library's other default
 * metrics are left out: some break the naming rules, some are NaN at times.
 */
function processRegistry(): Registry {
  const registry = new Registry()
  collectDefaultMetrics({ register: registry })
  for (const { name } of registry.getMetricsAsArray()) {
    if (!/^(process_|nodejs_(heap_size|external_memory))/.test(name)) registry.removeSingleMetric(name)
  }
  return registry
}
