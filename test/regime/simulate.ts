import type { DistanceWatch } from '../../src/regime/distance-watch.ts'
import type { Random } from '../../src/regime/random.ts'
import type { Observation, Shift, Transition, Verdict } from '../../src/regime/regime.ts'
import type { SymmetricSolver } from '../../src/spectrum/spectrum.ts'
import type { Window } from '../../src/window/window.ts'

/** Loadings of invented signals: one market column, four sector columns, N rows. */
export interface Model {
  readonly n: number
  readonly loadings: readonly Float64Array[]
}

/** Market share of variance `market` on average, each signal in one of four sectors of share `sector`. */
export function model(random: Random, n: number, market: number, sector: number): Model {
  const beta = Float64Array.from({ length: n }, () => 0.7 + 0.6 * random.unit())
  const norm = Math.sqrt(market / (beta.reduce((s, b) => s + b * b, 0) / n))
  const loadings = [beta.map((b) => b * norm)]
  for (let s = 0; s < 4; s++) {
    loadings.push(Float64Array.from({ length: n }, (_, i) => (i % 4 === s ? Math.sqrt(sector) : 0)))
  }
  return { n, loadings }
}

export const withMarket = (m: Model, from: number, to: number): Model => ({
  ...m,
  loadings: [m.loadings[0]!.map((b) => b * Math.sqrt(to / from)), ...m.loadings.slice(1)],
})

/** The same strengths with other partners: signals change their places in the sectors. */
export function rotated(m: Model, random: Random): Model {
  const order = Array.from({ length: m.n }, (_, i) => i)
  for (let i = m.n - 1; i > 0; i--) {
    const j = random.below(i + 1)
    ;[order[i], order[j]] = [order[j]!, order[i]!]
  }
  const moved = m.loadings.slice(1).map((column) => Float64Array.from(order, (i) => column[i]!))
  return { ...m, loadings: [m.loadings[0]!, ...moved] }
}

/** Unit-variance draws: normal, or Student's t with 4 degrees of freedom. */
export type Tail = 'normal' | 't4'

const unitDraw = (random: Random, tail: Tail): number => {
  if (tail === 'normal') return random.normal()
  let chi = 0
  for (let k = 0; k < 4; k++) chi += random.normal() ** 2
  return random.normal() / Math.sqrt(chi / 4) / Math.SQRT2
}

/** One frame of the model, each entry of unit variance, truncated at ±5. */
export function frameOf(m: Model, random: Random, tail: Tail, loudness = 1): Float64Array {
  const factors = m.loadings.map(() => unitDraw(random, tail))
  return Float64Array.from({ length: m.n }, (_, i) => {
    let x = 0
    let rest = 1
    m.loadings.forEach((column, k) => {
      x += column[i]! * factors[k]!
      rest -= column[i]! ** 2
    })
    x += Math.sqrt(Math.max(rest, 0.05)) * unitDraw(random, tail)
    return clip(x * loudness)
  })
}

export const clip = (x: number): number => Math.min(5, Math.max(-5, x))

export interface Run {
  readonly shifts: Shift[]
  readonly ended: { readonly number: number; readonly frame: number }[]
  readonly transitions: Transition[]
  readonly verdicts: Verdict[]
}

/** Frames are a second apart, from time 0. */
export const timeOfFrame = (frame: number): number => 1000 * frame

/** Pushes frames through a window and a watch, with the lagged window when there is one. */
export class Bench {
  readonly window: Window
  readonly watch: DistanceWatch
  readonly run: Run = { shifts: [], ended: [], transitions: [], verdicts: [] }
  readonly #lagged: Window | null
  readonly #solver: SymmetricSolver
  readonly #keep: boolean
  readonly #covariance: boolean
  #frame = 0

  constructor(
    window: Window,
    watch: DistanceWatch,
    solver: SymmetricSolver,
    options: { lagged?: Window; keep?: boolean; covariance?: boolean } = {},
  ) {
    this.window = window
    this.watch = watch
    this.#solver = solver
    this.#lagged = options.lagged ?? null
    this.#keep = options.keep ?? false
    this.#covariance = options.covariance ?? false
  }

  push(x: Float64Array, present: Uint8Array = new Uint8Array(x.length).fill(1)): Verdict {
    const o = this.observe(x, present)
    const verdict = this.watch.push(o)
    if (verdict.shift !== null) this.run.shifts.push(verdict.shift)
    if (verdict.ended !== null) this.run.ended.push({ number: verdict.ended, frame: o.frame })
    this.run.transitions.push(...verdict.transitions)
    if (this.#keep) this.run.verdicts.push(verdict)
    return verdict
  }

  suspend(): unknown {
    return {
      frame: this.#frame,
      window: this.window.snapshot(),
      lagged: this.#lagged?.snapshot() ?? null,
      watch: this.watch.snapshot(),
    }
  }

  resume(snapshot: unknown): void {
    const s = snapshot as { frame: number; window: unknown; lagged: unknown; watch: unknown }
    this.#frame = s.frame
    this.window.restore(s.window)
    this.#lagged?.restore(s.lagged)
    this.watch.restore(s.watch)
  }

  observe(x: Float64Array, present: Uint8Array): Observation {
    this.window.push(x, present)
    this.#lagged?.push(x, present)
    const frame = this.#frame++
    const active = this.window.active()
    const n = active.length
    const full = this.window.full && n >= 2
    const matrix = full ? this.#matrix(this.window, active) : null
    const lagged = this.#lagged
    const before = full && lagged?.full ? this.#matrix(lagged, active) : null
    return {
      frame,
      time: timeOfFrame(frame),
      names: Array.from({ length: x.length }, (_, i) => `S${i}`),
      cleaned: x,
      present,
      active,
      matrix,
      spectrum: matrix === null ? null : this.#solver.solve(matrix, n, 1),
      bulk: null,
      window: { frames: this.window.frames, effective: this.window.effective },
      certificate: 0,
      ...(lagged === null
        ? {}
        : {
            reference:
              before === null
                ? null
                : { matrix: before, spectrum: this.#solver.solve(before, n, 1), signals: lagged.active() },
          }),
    }
  }

  #matrix(window: Window, active: Int32Array): Float64Array {
    const out = new Float64Array(active.length ** 2)
    const scales = this.#covariance ? this.watch.reference?.scales : undefined
    if (scales === undefined) window.correlation(out, active)
    else window.covariance(out, active, scales)
    return out
  }
}
