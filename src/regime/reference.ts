import type { SymmetricSolver } from '../spectrum/spectrum.ts'
import type { FrameRing } from '../window/frame-ring.ts'
import { MomentEstimator } from '../window/moment-estimator.ts'
import { activeOf } from '../window/window.ts'
import type { Base } from './measures.ts'
import { bounded, energiesOf, matrixOf, quantile, type Rows, range, type Scale, unevenness } from './rows.ts'

/**
 * How much louder than nine tenths of the reference's frames a frame may be before the second look turns it
 * down; the tenth beyond may hold whatever it likes without loosening the bound.
 */
const spareLoudness = 2.5
const keptModes = 12

/** The state that the present is compared with. Plain data: structured-clone-able. */
export interface Reference extends Base {
  /** Roster indices of its signals, ascending; n of them. */
  readonly indices: Int32Array
  /** Frames it was made from. */
  readonly frames: number
  /** Mean and standard deviation by roster index; 0 for signals outside. */
  readonly means: Float64Array
  readonly scales: Float64Array
  /** The first eigenvectors as rows of length n. */
  readonly vectors: Float64Array
  /** Loudest frame taken at full weight by the second look, in multiples of the median energy. */
  readonly spread: number
  /** The matrix after the same bound on loudness. */
  readonly bounded: Float64Array
  /** Unevenness of its frames' loudness after that. */
  readonly unevenness: number
}

/** The frames of the ring, oldest first, standardised by the reference's means and scales. */
export function standardised(
  ring: FrameRing,
  count: number,
  skip: number,
  signals: Int32Array,
  means: Float64Array,
  scales: Float64Array,
): Rows {
  const n = signals.length
  const values = new Float64Array(count * n)
  const present = new Uint8Array(count * n)
  for (let row = 0; row < count; row++) {
    const ago = skip + count - 1 - row
    const x = ring.values(ago)
    const p = ring.present(ago)
    for (let a = 0; a < n; a++) {
      const i = signals[a]!
      if (!(i < x.length) || p[i] === 0) continue
      present[row * n + a] = 1
      values[row * n + a] = (x[i]! - means[i]!) / scales[i]!
    }
  }
  return { n, count, values, present }
}

/**
 * A reference from `count` frames of the ring, the newest of them `skip` frames ago. `only`: roster indices
 * that may take part. Null with fewer than two signals that move.
 */
export function referenceFrom(
  ring: FrameRing,
  count: number,
  skip: number,
  solver: SymmetricSolver,
  scale: Scale,
  only?: ReadonlySet<number>,
): { readonly reference: Reference; readonly rows: Rows } | null {
  const moments = new MomentEstimator()
  for (let ago = skip + count - 1; ago >= skip; ago--) moments.push(ring.values(ago), ring.present(ago))
  const indices = activeOf(moments).filter((i) => only?.has(i) ?? true)
  const n = indices.length
  if (n < 2) return null
  const means = new Float64Array(moments.size)
  const scales = new Float64Array(moments.size)
  for (const i of indices) {
    means[i] = moments.mean(i)
    scales[i] = Math.sqrt(moments.variance(i))
  }
  const rows = standardised(ring, count, skip, indices, means, scales)
  const energies = energiesOf(rows)
  const median = quantile(energies, 0.5)
  const spread = median > 0 ? spareLoudness * (quantile(energies, 0.9) / median) : Number.MAX_VALUE
  const matrix = matrixOf(rows, range(count), 'correlation')
  const base = solvedBase(matrix, n, solver)
  const quiet = bounded(rows, spread)
  const reference: Reference = {
    ...base,
    indices,
    frames: count,
    means,
    scales,
    spread,
    bounded: matrixOf(quiet, range(count), scale),
    unevenness: unevenness(quiet, base.leading),
  }
  return { reference, rows }
}

/** A matrix with its spectrum and first modes, as a base. */
export function solvedBase(matrix: Float64Array, n: number, solver: SymmetricSolver) {
  const spectrum = solver.solve(matrix, n, Math.min(n, keptModes))
  return {
    n,
    matrix,
    values: spectrum.values.slice(0, n),
    leading: spectrum.vectors.slice(0, n),
    vectors: spectrum.vectors.slice(0, spectrum.modes * n),
  }
}

/** Rows and columns `places` of an n × n matrix. */
export function submatrix(matrix: Float64Array, n: number, places: Int32Array): Float64Array {
  const m = places.length
  const out = new Float64Array(m * m)
  for (let a = 0; a < m; a++) {
    for (let b = 0; b < m; b++) out[a * m + b] = matrix[places[a]! * n + places[b]!]!
  }
  return out
}

/** Places in `of` (ascending) of the entries that `other` (ascending) has too. */
export function commonPlaces(of: Int32Array, other: Int32Array): Int32Array {
  const places: number[] = []
  for (let a = 0, b = 0; a < of.length; a++) {
    while (b < other.length && other[b]! < of[a]!) b++
    if (other[b] === of[a]) places.push(a)
  }
  return Int32Array.from(places)
}
