import type { SymmetricSolver } from '../spectrum/spectrum.ts'
import type { Base } from './measures.ts'
import type { Rows } from './rows.ts'

/** A direction in which the matrix changed: an eigenpair of C − C0. */
export interface ChangeMode {
  /** Eigenvalue of C − C0; negative where movement was lost. */
  readonly weight: number
  readonly vector: Float64Array
  /** Variance along it in the reference. */
  readonly before: number
}

const mostModes = 3

/**
 * The main directions of C − C0, largest weight first: up to three of either sign, at least half the largest.
 * `beside`: only those at right angles to the base's leading mode.
 */
export function changeModes(
  matrix: Float64Array,
  base: Base,
  solver: SymmetricSolver,
  beside = false,
): ChangeMode[] {
  const n = base.n
  const modes: ChangeMode[] = []
  const difference = matrix.map((v, k) => v - base.matrix[k]!)
  if (beside) project(difference, base.leading)
  for (const sign of [1, -1]) {
    const solved = solver.solve(sign < 0 ? difference.map((v) => -v) : difference, n, Math.min(n, mostModes))
    for (let k = 0; k < solved.modes; k++) {
      const weight = solved.values[k]!
      if (!(weight > 0)) continue
      const vector = solved.vectors.slice(k * n, (k + 1) * n)
      modes.push({ weight: sign * weight, vector, before: quadratic(base.matrix, vector) })
    }
  }
  modes.sort((a, b) => Math.abs(b.weight) - Math.abs(a.weight))
  const least = Math.abs(modes[0]?.weight ?? 0) / 2
  return modes.filter((mode) => Math.abs(mode.weight) >= least)
}

/** A ← P A P for symmetric A, P the projection off the unit vector v. */
function project(a: Float64Array, v: Float64Array): void {
  const n = v.length
  const av = new Float64Array(n)
  for (let i = 0; i < n; i++) for (let j = 0; j < n; j++) av[i]! += a[i * n + j]! * v[j]!
  const along = av.reduce((s, x, i) => s + x * v[i]!, 0)
  for (let i = 0; i < n; i++) {
    for (let j = 0; j < n; j++) a[i * n + j]! += along * v[i]! * v[j]! - av[i]! * v[j]! - v[i]! * av[j]!
  }
}

/** vᵀ A v. */
export function quadratic(matrix: Float64Array, v: Float64Array): number {
  const n = v.length
  let sum = 0
  for (let i = 0; i < n; i++) {
    let row = 0
    for (let j = 0; j < n; j++) row += matrix[i * n + j]! * v[j]!
    sum += v[i]! * row
  }
  return sum
}

/** Energy of every row along every mode: rows.count numbers for each. */
function energiesAlong(rows: Rows, modes: readonly ChangeMode[]): Float64Array[] {
  return modes.map(({ vector }) => {
    const out = new Float64Array(rows.count)
    for (let row = 0; row < rows.count; row++) {
      let dot = 0
      for (let a = 0; a < rows.n; a++) dot += vector[a]! * rows.values[row * rows.n + a]!
      out[row] = dot * dot
    }
    return out
  })
}

/**
 * How much of the departure the newest half of the rows carries, in units of its fair share: about 2 for a
 * change since the middle, 1 for one that fills the window, near 0 when the newest frames agree with the
 * reference and the departure is on its way out (or something else left).
 */
export function newestHalf(rows: Rows, modes: readonly ChangeMode[]): number {
  const energies = energiesAlong(rows, modes)
  const half = Math.floor(rows.count / 2)
  let all = 0
  let newest = 0
  modes.forEach((mode, k) => {
    energies[k]!.forEach((e, row) => {
      const part = mode.weight * (e - mode.before)
      all += part / rows.count
      if (row >= half) newest += part / (rows.count - half)
    })
  })
  return all > 0 ? newest / all : 0
}

/** Where the change began, as row numbers: most likely, and the span of what is likely. */
export interface ChangePoint {
  readonly at: number
  readonly from: number
  readonly to: number
}

/**
 * Log-likelihood lost inside the interval of likely starts. −ln .05 = 3 would do for known modes; these were
 * found on the same frames, which flatters frames before the change. 10 was set by simulation: the interval
 * then holds the true start in nine of ten changes of strength and eight of ten changes of partners.
 */
const likely = 10

/**
 * Most likely first row of the change, by the profile likelihood of a change of variance along the modes:
 * with m rows since, variances b_k there and a_k before, log L = m/2·Σ(b/a − 1 − ln b/a) (Hinkley 1970 for
 * the estimate). The interval holds every start whose log L is within `likely` of the best (Siegmund 1988
 * for likelihood sets of change points), times the dispersion where energies scatter more than normal ones
 * (quasi-likelihood: Wedderburn 1974). `least`: fewest rows a change may have.
 */
export function changePoint(rows: Rows, modes: readonly ChangeMode[], least: number): ChangePoint {
  const energies = energiesAlong(rows, modes)
  const sums = new Float64Array(modes.length)
  const likelihood = new Float64Array(rows.count).fill(-Infinity)
  let best = rows.count - 1
  for (let row = rows.count - 1; row >= 0; row--) {
    const m = rows.count - row
    let log = 0
    for (let k = 0; k < modes.length; k++) {
      sums[k]! += energies[k]![row]!
      const ratio = Math.max(1e-12, sums[k]! / m / Math.max(1e-12, modes[k]!.before))
      if (Math.sign(ratio - 1) === Math.sign(modes[k]!.weight)) log += (m / 2) * (ratio - 1 - Math.log(ratio))
    }
    if (m < least) continue
    likelihood[row] = log
    if (!(log <= likelihood[best]!)) best = row
  }
  const allowed = likely * dispersion(energies, best)
  let from = best
  let to = best
  for (let row = 0; row < rows.count; row++) {
    if (!(likelihood[row]! >= likelihood[best]! - allowed)) continue
    from = Math.min(from, row)
    to = Math.max(to, row)
  }
  return { at: best, from, to }
}

/** Variance of the energies over that of squared normals with the same means before and after; at least 1. */
function dispersion(energies: readonly Float64Array[], split: number): number {
  let sum = 0
  let count = 0
  for (const energy of energies) {
    for (const part of [energy.subarray(0, split), energy.subarray(split)]) {
      const mean = part.reduce((s, e) => s + e, 0) / part.length
      if (!(mean > 0)) continue
      for (const e of part) sum += (e / mean - 1) ** 2 / 2
      count += part.length
    }
  }
  return count > 0 ? Math.max(1, sum / count) : 1
}
