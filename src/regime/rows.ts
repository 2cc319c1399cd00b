import { MomentEstimator } from '../window/moment-estimator.ts'
import { addFourOuter, addOuter, triangleSize } from '../window/triangle.ts'

/** Standardised frames of n signals, row by row; a missing entry is 0 with `present` 0. */
export interface Rows {
  readonly n: number
  readonly count: number
  readonly values: Float64Array
  readonly present: Uint8Array
}

export type Scale = 'correlation' | 'covariance'

/**
 * Matrix of the rows in the order given, n × n row-major: correlation, or covariance in the rows' own unit.
 * With `decay` the last row weighs most.
 */
export function matrixOf(rows: Rows, order: Iterable<number>, scale: Scale, decay: number | null = null) {
  const n = rows.n
  if (decay === null && scale === 'correlation' && rows.present.every((here) => here === 1)) {
    return completeCorrelation(rows, order)
  }
  const moments = new MomentEstimator(decay)
  for (const row of order) {
    moments.push(rows.values.subarray(row * n, row * n + n), rows.present.subarray(row * n, row * n + n))
  }
  const out = new Float64Array(n * n)
  const every = Int32Array.from({ length: n }, (_, i) => i)
  if (scale === 'correlation') moments.correlation(out, every)
  else moments.covariance(out, every, new Float64Array(n).fill(1))
  return out
}

/** Pearson correlation of standardised rows without a gap: the same figures, four rows a pass. */
function completeCorrelation({ n, values }: Rows, order: Iterable<number>): Float64Array {
  const second = new Float64Array(triangleSize(n))
  const sum = new Float64Array(n)
  const four: number[] = []
  let count = 0
  for (const row of order) {
    count++
    const at = row * n
    for (let i = 0; i < n; i++) sum[i] = sum[i]! + values[at + i]!
    four.push(at)
    if (four.length < 4) continue
    addFourOuter(second, values, four, n)
    four.length = 0
  }
  for (const at of four) addOuter(second, values.subarray(at, at + n), n, 1)
  const factors = new Float64Array(n)
  for (let i = 0; i < n; i++) {
    const own = second[triangleSize(i) + i]!
    const centred = own - (sum[i]! * sum[i]!) / count
    factors[i] = centred > 1e-12 * own ? 1 / Math.sqrt(centred) : 0
  }
  const out = new Float64Array(n * n)
  for (let i = 0, k = 0; i < n; i++) {
    for (let j = 0; j <= i; j++, k++) {
      const r = (second[k]! - (sum[i]! * sum[j]!) / count) * factors[i]! * factors[j]!
      const bounded = i === j ? 1 : Math.min(1, Math.max(-1, r))
      out[i * n + j] = bounded
      out[j * n + i] = bounded
    }
  }
  return out
}

export function* range(count: number, from = 0): Generator<number> {
  for (let k = from; k < count; k++) yield k
}

/** Mean square of each row over its present entries. */
export function energiesOf(rows: Rows): Float64Array {
  const energies = new Float64Array(rows.count)
  for (let row = 0; row < rows.count; row++) {
    let sum = 0
    let present = 0
    for (let k = row * rows.n; k < (row + 1) * rows.n; k++) {
      sum += rows.values[k]! ** 2
      present += rows.present[k]!
    }
    energies[row] = present > 0 ? sum / present : 0
  }
  return energies
}

/** The q-quantile by rank, 0 of an empty list. */
export function quantile(values: Float64Array, q: number): number {
  const sorted = values.slice().sort()
  return sorted[Math.min(sorted.length - 1, Math.floor(q * sorted.length))] ?? 0
}

/**
 * The rows with no frame louder than `spread` times the median one. A frame r times as loud as that bound is
 * turned down to 1/r of it, but not below the median: the further out, the less it says (the redescending
 * estimators of Hampel 1974). A frame of energy e moves a matrix of T frames by e·n/T at most, so no single
 * frame (nor a loud handful) carries a departure in what comes out.
 */
export function bounded(rows: Rows, spread: number): Rows {
  const energies = energiesOf(rows)
  const median = quantile(energies, 0.5)
  const cap = spread * median
  const values = rows.values.slice()
  for (let row = 0; row < rows.count; row++) {
    if (!(energies[row]! > cap)) continue
    const factor = Math.sqrt(Math.max(median, (cap * cap) / energies[row]!) / energies[row]!)
    for (let k = row * rows.n; k < (row + 1) * rows.n; k++) values[k]! *= factor
  }
  return { ...rows, values }
}

/**
 * By how much more a matrix of the rows scatters because their loudness off the mode `leading` swings: with
 * energies e and weights w (1, or falling by `decay` from the last row back),
 * [Σw²e²/(Σwe)²]/[Σw²/(Σw)²], Kish's effective numbers without and with the loudness (Kish 1965). Off the
 * leading mode, because a stronger common mode is a finding and not unevenness.
 */
export function unevenness(rows: Rows, leading: Float64Array, decay: number | null = null): number {
  let [sum, squares, weights, squaredWeights] = [0, 0, 0, 0]
  let w = 1
  for (let row = rows.count - 1; row >= 0; row--) {
    let energy = 0
    let along = 0
    for (let a = 0; a < rows.n; a++) {
      const z = rows.values[row * rows.n + a]!
      energy += z * z
      along += z * leading[a]!
    }
    const part = w * Math.max(0, energy - along * along)
    sum += part
    squares += part * part
    weights += w
    squaredWeights += w * w
    w *= decay ?? 1
  }
  return sum > 0 ? (squares * weights * weights) / (sum * sum * squaredWeights) : 1
}
