import type { SymmetricSolver } from '../spectrum/spectrum.ts'
import { FrameRing, type RingSnapshot } from '../window/frame-ring.ts'
import type { Calibration } from './evidence.ts'
import { type DrawPlan, type DrawsSnapshot, LimitDraws } from './limit-draws.ts'
import { type Reference, referenceFrom } from './reference.ts'
import type { Rows, Scale } from './rows.ts'

export interface LearnerPlan {
  /** Frames of the reference. */
  readonly frames: number
  /** Frames to let pass after it, until the window holds nothing of it. */
  readonly settle: number
  /** Frames before this time (milliseconds since 1970) are not of the reference. */
  readonly since: number
  readonly draws: DrawPlan
  /** Probability with which one window may pass a limit; null when no limits are to be learnt. */
  readonly tail: number | null
  readonly scale: Scale
  readonly seed: number
}

export interface Learnt {
  readonly reference: Reference
  readonly calibration: Calibration | null
}

/** Multiply-and-adds that one learning may cost (about 2 s), before the number of draws is cut. */
const affordable = 2e9
const mostDraws = 400
const leastDraws = 100

/** 400 draws, fewer where signals are so many that these would take more than a few seconds. */
function drawsFor(n: number, span: number): number {
  const cost = (span * n * n) / 2 + 3 * n ** 3
  return Math.round(Math.min(mostDraws, Math.max(leastDraws, affordable / cost)))
}

/**
 * Learns a reference: gathers its frames, then lets the window leave them behind while the limits are
 * drawn, a few draws a frame.
 */
export class Learner {
  #plan: LearnerPlan
  #solver: SymmetricSolver
  #ring: FrameRing
  #settled = 0
  #reference: Reference | null = null
  #rows: Rows | null = null
  #draws: LimitDraws | null = null
  #calibration: Calibration | null = null

  /** `given`: a reference that need not be gathered, such as one from a file. */
  constructor(plan: LearnerPlan, solver: SymmetricSolver, given: Reference | null = null) {
    this.#plan = plan
    this.#solver = solver
    this.#ring = new FrameRing(given === null ? plan.frames : 1)
    if (given !== null) this.#begin(given, { n: given.n, count: 0, values: nothing, present: noMarks })
  }

  /** Frames had and wanted. */
  get progress(): { readonly have: number; readonly want: number } {
    const gathered = this.#reference === null ? this.#ring.length : this.#plan.frames
    return {
      have: gathered + Math.min(this.#settled, this.#plan.settle),
      want: this.#plan.frames + this.#plan.settle,
    }
  }

  /** The result, once everything is there. */
  get learnt(): Learnt | null {
    if (this.#reference === null || this.#settled < this.#plan.settle) return null
    if (this.#plan.tail !== null && this.#calibration === null) return null
    return { reference: this.#reference, calibration: this.#calibration }
  }

  push(x: Float64Array, present: Uint8Array, time: number): void {
    if (this.#reference === null) {
      if (time < this.#plan.since) return
      this.#ring.push(x, present)
      if (!this.#ring.full) return
      const made = referenceFrom(this.#ring, this.#plan.frames, 0, this.#solver, this.#plan.scale)
      // Fewer than two signals moved: the ring slides on until two do.
      if (made !== null) {
        this.#ring = new FrameRing(1)
        this.#begin(made.reference, made.rows)
      }
      return
    }
    this.#settled++
    if (this.#draws === null || this.#calibration !== null) return
    const pace = Math.max(50, this.#plan.settle - 1)
    this.#draws.step(Math.ceil(this.#draws.wanted / pace))
    if (!this.#draws.done) return
    this.#calibration = this.#draws.calibration(this.#plan.tail!)
    this.#draws = null
    this.#rows = null
  }

  snapshot(): LearnerSnapshot {
    return structuredClone({
      plan: this.#plan,
      ring: this.#ring.snapshot(),
      settled: this.#settled,
      reference: this.#reference,
      rows: this.#rows,
      draws: this.#draws?.snapshot() ?? null,
      calibration: this.#calibration,
    })
  }

  static from(snapshot: LearnerSnapshot, solver: SymmetricSolver): Learner {
    const s = structuredClone(snapshot)
    const learner = new Learner(s.plan, solver)
    if (s.reference !== null) learner.#ring = new FrameRing(1)
    learner.#ring.restore(s.ring)
    learner.#settled = s.settled
    if (s.reference !== null && s.rows !== null) learner.#begin(s.reference, s.rows)
    learner.#reference = s.reference
    if (s.draws === null) learner.#draws = null
    else learner.#draws?.restore(s.draws)
    learner.#calibration = s.calibration
    return learner
  }

  #begin(reference: Reference, rows: Rows): void {
    const { draws, scale, seed, tail } = this.#plan
    this.#reference = reference
    if (tail === null) return
    this.#rows = rows
    const wanted = drawsFor(reference.n, draws.span)
    this.#draws = new LimitDraws(draws, rows, reference, scale, this.#solver, wanted, seed)
  }
}

const nothing = new Float64Array(0)
const noMarks = new Uint8Array(0)

export interface LearnerSnapshot {
  readonly plan: LearnerPlan
  readonly ring: RingSnapshot
  readonly settled: number
  readonly reference: Reference | null
  readonly rows: Rows | null
  readonly draws: DrawsSnapshot | null
  readonly calibration: Calibration | null
}
