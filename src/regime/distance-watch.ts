import type { SymmetricSolver } from '../spectrum/spectrum.ts'
import { FrameRing, type RingSnapshot } from '../window/frame-ring.ts'
import { Comparer, type Comparison } from './comparison.ts'
import { type Confirmed, confirm } from './confirm.ts'
import { type ExplicitLimits, type Reading, strongest, weigh } from './evidence.ts'
import { Learner, type LearnerSnapshot, type Learnt } from './learner.ts'
import { learningPlan, settleOf } from './learning-plan.ts'
import { calmUnder, counted, nearFrom, noRuns, type Pace, paceOf, type Runs } from './pace.ts'
import type { Reference } from './reference.ts'
import { referenceOf } from './reference-record.ts'
import type { Observation, RegimeWatch, Shift, State, Transition, Verdict } from './regime.ts'
import { type RememberedRegime, remember } from './remembered.ts'
import type { Scale } from './rows.ts'
import { reportShift } from './shift-report.ts'
import { percent, sentence, shown, sightOf } from './verdict-parts.ts'
import type { WatchOptions } from './watch-options.ts'

/** What changes from frame to frame, apart from rings and learner: structured-clone-able. */
interface Memory {
  state: State
  /** Number of the last shift; 0: none yet. */
  shifts: number
  seen: number
  generation: number
  runs: Runs
  since: number | null
  planned: boolean
  /** Frames since the reference's last one. */
  behind: number
  /** Frames in which too few of the reference's signals were there. */
  lost: number
  known: Learnt | null
  remembered: RememberedRegime[]
}

/**
 * The decision by distance from a reference: leading share, W2 of the spectra, Frobenius distance and
 * partner distance, each against a limit learnt from the reference by resampling (or given), confirmed by a
 * run of frames and a second look that no single frame can carry.
 *
 * `learning` until the reference is complete and the window holds nothing of it; then `steady`,
 * `straining` (near the limit, or beyond it and not confirmed) and `shifted` (confirmed). After a shift a new
 * reference is learnt from the frames since it; the shift ends, with `ended` set, when the evidence under
 * the new reference is low or when the old regime has returned. A further change under the new reference is a
 * shift of its own: then `ended` (of the old) and `shift` are set in the same frame. With a lagged reference
 * the first frames only teach the limits. Signals come and go; those that window and reference share are compared.
 */
export class DistanceWatch implements RegimeWatch {
  #options: WatchOptions
  #solver: SymmetricSolver
  #scale: Scale
  #pace: Pace
  #explicit: ExplicitLimits | null
  #lag: number | null
  #ring: FrameRing
  #times: Float64Array
  #learner: Learner | null
  #comparer: Comparer
  #m: Memory
  #transitions: Transition[] = []

  constructor(options: WatchOptions, solver: SymmetricSolver) {
    this.#options = options
    this.#solver = solver
    this.#scale = options.scale ?? 'correlation'
    this.#pace = paceOf(options.window.span)
    this.#explicit = 'explicit' in options.limits ? options.limits.explicit : null
    this.#lag = 'lagged' in options.reference ? options.reference.lagged : null
    const { span } = options.window
    this.#ring = new FrameRing(Math.max(2 * span, span + (this.#lag ?? 0)))
    this.#times = new Float64Array(this.#ring.capacity)
    this.#comparer = new Comparer(solver)
    this.#m = {
      state: 'learning',
      shifts: 0,
      seen: 0,
      generation: 0,
      runs: noRuns,
      since: null,
      planned: false,
      behind: 0,
      lost: 0,
      known: null,
      remembered: [],
    }
    this.#learner = 'from' in options.reference ? null : this.#newLearner()
  }

  /** The present reference; null while the first is learnt. */
  get reference(): Reference | null {
    return this.#m.known?.reference ?? null
  }

  push(o: Observation): Verdict {
    this.#transitions = []
    this.#times[this.#m.seen % this.#times.length] = o.time
    this.#m.seen++
    this.#m.behind++
    this.#ring.push(o.cleaned, o.present)
    let ended = this.#followPlan(o)
    const adopted = !this.#m.planned && this.#learn(o)
    // In covariance scale the matrix in hand is still in the scales of the reference before.
    const comparison = adopted && this.#scale === 'covariance' ? null : this.#compare(o)
    const known = this.#m.known
    let readings: readonly Reading[] = []
    let shift: Shift | null = null
    if (known !== null && comparison !== null && !this.#m.planned) {
      readings = weigh(comparison.measures, known.calibration, this.#explicit)
      const decided = this.#decide(o, comparison, readings, known)
      shift = decided.shift
      ended ??= decided.ended
    } else if (known !== null && o.spectrum !== null && !adopted) ended ??= this.#missSignals(o)
    return this.#verdict(o, comparison, readings, shift, ended)
  }

  snapshot(): unknown {
    return structuredClone({
      memory: this.#m,
      ring: this.#ring.snapshot(),
      times: this.#times,
      learner: this.#learner?.snapshot() ?? null,
    } satisfies WatchSnapshot)
  }

  restore(snapshot: unknown): void {
    const s = structuredClone(snapshot) as WatchSnapshot
    this.#m = s.memory
    this.#ring.restore(s.ring)
    this.#times.set(s.times)
    this.#learner = s.learner === null ? null : Learner.from(s.learner, this.#solver)
    this.#comparer = new Comparer(this.#solver)
  }

  /** Begins and ends planned changes; gives the shift that a planned change ends. */
  #followPlan(o: Observation): number | null {
    const plan = this.#options.planned?.find((p) => o.time >= p.from && o.time < p.to)
    const m = this.#m
    if (plan === undefined) {
      if (m.planned) {
        m.planned = false
        this.#learner = this.#newLearner()
      }
      return null
    }
    if (m.planned) return null
    m.planned = true
    return this.#startOver(o, `a planned change has begun${plan.note === undefined ? '' : `: ${plan.note}`}`)
  }

  /** Forgets the reference without a page. */
  #startOver(o: Observation, why: string): number | null {
    const m = this.#m
    const ended = m.state === 'shifted' ? m.shifts : null
    if (m.state !== 'learning') this.#move(o, 'learning', `A new reference is learnt without a page: ${why}.`)
    m.known = null
    m.runs = noRuns
    m.since = null
    m.lost = 0
    this.#learner = null
    return ended
  }

  /** Learns on; true in the frame in which a reference is complete. */
  #learn(o: Observation): boolean {
    const m = this.#m
    if (
      this.#learner === null &&
      m.known === null &&
      'from' in this.#options.reference &&
      o.matrix !== null
    ) {
      const given = referenceOf(this.#options.reference.from, o.names, this.#solver)
      this.#learner = m.generation === 0 && given !== null ? this.#newLearner(given) : this.#newLearner()
    }
    this.#learner?.push(o.cleaned, o.present, o.time)
    const learnt = this.#learner?.learnt ?? null
    if (learnt === null) return false
    m.known = learnt
    m.behind = 'from' in this.#options.reference && m.generation === 1 ? m.seen : settleOf(this.#options)
    m.runs = noRuns
    m.since = null
    this.#learner = null
    const { reference } = learnt
    m.remembered = remember(m.remembered, m.shifts, reference.indices, reference.matrix)
    if (m.state === 'learning') {
      this.#move(
        o,
        'steady',
        `The reference of ${reference.frames} frames and ${reference.n} signals is complete, and the window holds nothing of it.`,
      )
    }
    return true
  }

  #compare(o: Observation): Comparison | null {
    if (this.#lag !== null) return this.#comparer.againstLagged(o)
    return this.#m.known === null ? null : this.#comparer.against(this.#m.known.reference, o)
  }

  /** After as many frames as the window is long with too few of the reference's signals, learns anew. */
  #missSignals(o: Observation): number | null {
    if (this.#lag !== null || this.#m.planned) return null
    if (++this.#m.lost < this.#options.window.span) return null
    const ended = this.#startOver(o, 'fewer than half of the signals of the old one are left')
    this.#learner = this.#newLearner()
    return ended
  }

  #decide(
    o: Observation,
    comparison: Comparison,
    readings: readonly Reading[],
    known: Learnt,
  ): { readonly shift: Shift | null; readonly ended: number | null } {
    const m = this.#m
    m.lost = 0
    const top = strongest(readings)
    const ratio = top?.ratio ?? 0
    m.runs = counted(m.runs, ratio)
    m.since = ratio < calmUnder ? null : (m.since ?? o.time)
    const told =
      top === null ? 'no statistic has a limit' : `${top.statistic} is at ${percent(ratio)} of its limit`
    if (m.state === 'shifted') {
      const ended = this.#end(o, ratio, told)
      if (ended !== null) return { shift: null, ended }
    } else if (m.state === 'steady' && (m.runs.beyond > 0 || m.runs.near >= this.#pace.strain)) {
      const held = ratio >= 1 ? 'not confirmed yet' : `${m.runs.near} frames in a row near it`
      this.#move(o, 'straining', `${sentence(told)}, ${held}.`)
    } else if (m.state === 'straining' && m.runs.calm >= this.#pace.calm) {
      this.#move(o, 'steady', `${sentence(told)}: ${m.runs.calm} frames in a row near rest.`)
    }
    const waited = m.runs.beyond - this.#pace.confirm
    const relearning = m.state === 'shifted' && this.#learner !== null
    if (ratio < 1 || waited < 0 || waited % this.#pace.confirm !== 0 || relearning) {
      return { shift: null, ended: null }
    }
    const confirmed = confirm({
      ring: this.#ring,
      window: { ...this.#options.window, effective: o.window.effective },
      lag: this.#lag,
      signals: comparison.signals,
      known,
      explicit: this.#explicit,
      scale: this.#scale,
      solver: this.#solver,
    })
    return confirmed === null
      ? { shift: null, ended: null }
      : this.#shift(o, comparison, readings, known, confirmed)
  }

  /** Ends the shift when the new reference fits, or the old regime is back. */
  #end(o: Observation, ratio: number, told: string): number | null {
    const m = this.#m
    if (this.#learner === null && ratio < nearFrom) {
      this.#move(o, 'steady', `The new reference is complete and fits: ${told}.`, m.shifts)
      return m.shifts
    }
    if (this.#learner !== null && this.#lag === null && m.runs.calm >= this.#pace.back) {
      this.#move(o, 'steady', `The old regime has returned: ${told}.`, m.shifts)
      this.#learner = null
      return m.shifts
    }
    return null
  }

  #shift(
    o: Observation,
    comparison: Comparison,
    readings: readonly Reading[],
    known: Learnt,
    confirmed: Confirmed,
  ): { readonly shift: Shift; readonly ended: number | null } {
    const m = this.#m
    const ended = m.state === 'shifted' ? m.shifts : null
    const { shift, framesSince } = reportShift({
      number: m.shifts + 1,
      observation: o,
      comparison,
      readings,
      ...confirmed,
      learnt: known.calibration,
      ring: this.#ring,
      timeOf: (ago) => this.#times[(m.seen - 1 - ago) % this.#times.length]!,
      reach: this.#lag === null ? m.behind : 2 * this.#options.window.span,
      least: this.#pace.confirm,
      remembered: m.remembered,
      sight: sightOf(o),
      scale: this.#scale,
      solver: this.#solver,
    })
    m.shifts++
    const { statistic, ratio } = shift.evidence
    this.#move(
      o,
      'shifted',
      `Shift ${m.shifts} (${shift.kind}): ${statistic} is at ${percent(ratio)} of its limit for ${m.runs.beyond} frames, and stays beyond with no frame taken as louder than usual.`,
      m.shifts,
    )
    this.#learner = this.#newLearner()
    for (let ago = Math.min(framesSince, this.#ring.length) - 1; ago >= 0; ago--) {
      this.#learner.push(
        this.#ring.values(ago),
        this.#ring.present(ago),
        this.#times[(m.seen - 1 - ago) % this.#times.length]!,
      )
    }
    m.runs = noRuns
    return { shift, ended }
  }

  #newLearner(given: Reference | null = null): Learner {
    return new Learner(learningPlan(this.#options, this.#m.generation++, given), this.#solver, given)
  }

  #move(o: Observation, to: State, why: string, shift: number | null = null): void {
    this.#transitions.push({ time: o.time, frame: o.frame, from: this.#m.state, to, why, shift })
    this.#m.state = to
  }

  #verdict(
    o: Observation,
    comparison: Comparison | null,
    readings: readonly Reading[],
    shift: Shift | null,
    ended: number | null,
  ): Verdict {
    return {
      ...shown(o, comparison?.measures ?? null, readings, this.#m.since),
      state: this.#m.state,
      learning: this.#progress(),
      shift,
      ended,
      transitions: this.#transitions,
    }
  }

  #progress(): Verdict['learning'] {
    if (this.#learner !== null) return this.#learner.progress
    const { span } = this.#options.window
    return this.#m.known === null ? { have: Math.min(this.#m.seen, span), want: span } : null
  }
}

interface WatchSnapshot {
  readonly memory: Memory
  readonly ring: RingSnapshot
  readonly times: Float64Array
  readonly learner: LearnerSnapshot | null
}

/** The reference that a snapshot holds; null while the first is learnt. */
export const referenceInSnapshot = (snapshot: unknown): Reference | null =>
  (snapshot as WatchSnapshot).memory.known?.reference ?? null
