import { type ChangeMode, quadratic } from './change-modes.ts'
import type { Calibration, Reading } from './evidence.ts'
import type { Carrier, ShiftKind } from './regime.ts'
import type { Scale } from './rows.ts'
import type { SecondLook } from './second-look.ts'

const mostCarriers = 10

/**
 * Squared distances that noise alone leaves between window and reference. Without calibration: from the
 * variance (1−ρ²)²/T of a correlation (Fisher 1915, large T), none for the spectra.
 */
export function noiseFloor(
  look: SecondLook,
  learnt: Calibration | null,
  effective: number,
  frames: number,
): { readonly whole: number; readonly spectra: number } {
  const n = look.base.n
  if (learnt !== null) {
    const scale = n / learnt.n
    return {
      whole: learnt.distances.frobenius.meanSquare * scale,
      spectra: learnt.distances['spectral-distance'].meanSquare * scale,
    }
  }
  let sum = 0
  for (let i = 0; i < n; i++) {
    for (let j = 0; j < n; j++) if (i !== j) sum += (1 - look.base.matrix[i * n + j]! ** 2) ** 2
  }
  return { whole: (sum * (1 / effective + 1 / frames)) / n, spectra: 0 }
}

/**
 * What sort of change it is.
 * - `one-signal`: more than 0.6 of the squared change, noise taken off, lies in one signal's row and column.
 * - `amplitude` (covariance scale): brought to the reference's variances, less than 0.3 of the change is left.
 * - `partners`: only the partner distance is beyond its limit; or the rotation share 1 − W2²/ceiling², noise
 *   taken off both, is above one half; or the mode of change lies mostly outside the reference's leading
 *   modes, which is a new group of partners even where the spectrum saw all of it.
 * - `strength`: the rest.
 */
export function kindOf(
  look: SecondLook,
  readings: readonly Reading[],
  modes: readonly ChangeMode[],
  noise: { readonly whole: number; readonly spectra: number },
  scale: Scale,
): ShiftKind {
  const { ceiling, w2 } = look.measures
  const whole = Math.max(ceiling ** 2 - noise.whole, 0)
  if (whole > 0.2 * noise.whole && largestRow(look, noise.whole) > 0.6) return 'one-signal'
  if (scale === 'covariance' && whole > 0 && sameVariances(look) ** 2 - noise.whole < 0.3 * whole)
    return 'amplitude'
  const beyond = readings.filter((r) => r.ratio >= 1)
  if (beyond.length > 0 && beyond.every((r) => r.statistic === 'partner-distance')) return 'partners'
  const spectra = Math.max(w2 ** 2 - noise.spectra, 0)
  if (!(whole > 0) || spectra < 0.5 * whole) return 'partners'
  return known(look, modes[0]) < 0.5 ? 'partners' : 'strength'
}

/** Largest share of the squared change, less noise, that one signal's row and column hold. */
function largestRow(look: SecondLook, noise: number): number {
  const n = look.base.n
  let total = 0
  let largest = 0
  for (let i = 0; i < n; i++) {
    let row = 0
    for (let j = 0; j < n; j++) {
      const d = (look.matrix[i * n + j]! - look.base.matrix[i * n + j]!) ** 2
      total += d
      row += i === j ? d : 2 * d
    }
    largest = Math.max(largest, row)
  }
  const left = total - n * noise
  return left > 0 ? (largest - 2 * noise) / left : 0
}

/** ‖·‖_F/√n of the change after the window's variances are brought to the reference's. */
function sameVariances(look: SecondLook): number {
  const n = look.base.n
  const factor = Float64Array.from({ length: n }, (_, i) => {
    const now = look.matrix[i * n + i]!
    return now > 0 ? Math.sqrt(look.base.matrix[i * n + i]! / now) : 0
  })
  let sum = 0
  for (let i = 0; i < n; i++) {
    for (let j = 0; j < n; j++) {
      sum += (look.matrix[i * n + j]! * factor[i]! * factor[j]! - look.base.matrix[i * n + j]!) ** 2
    }
  }
  return Math.sqrt(sum / n)
}

/** Squared length of a mode's part inside the reference's modes that stand out of unit noise, at least the first. */
function known(look: SecondLook, mode: ChangeMode | undefined): number {
  if (mode === undefined) return 1
  const { n, values, vectors } = look.base
  const edge = (1 + Math.sqrt(n / look.rows.count)) ** 2
  let inside = 0
  for (let k = 0; k * n < vectors.length; k++) {
    if (k > 0 && values[k]! < edge) break
    let dot = 0
    for (let a = 0; a < n; a++) dot += vectors[k * n + a]! * mode.vector[a]!
    inside += dot * dot
  }
  return inside
}

/**
 * Who carries the change, to first order: vᵀ(C−C0)v = Σ c_i, c_i = v_i Σ_j (C−C0)_ij v_j.
 * Strength and amplitude: v is the leading mode (of the window when it grew, of the reference when it fell)
 * and shares are of its movement λ1 − λ1⁰. Otherwise v is the main mode of C − C0 itself (for partners: of its
 * part beside the leading mode) and shares are of its eigenvalue. The ten largest are named; `remainder` is 1 less their sum: the signals not named, and for
 * the leading mode also what first order does not explain.
 */
export function carriersOf(
  look: SecondLook,
  kind: ShiftKind,
  modes: readonly ChangeMode[],
  names: readonly string[],
): { readonly carriers: Carrier[]; readonly remainder: number } {
  const { base, matrix, values, vectors, signals } = look
  const n = base.n
  const grew = values[0]! >= base.values[0]!
  const leading = kind === 'strength' || kind === 'amplitude'
  const vector = leading ? (grew ? vectors.subarray(0, n) : base.leading) : modes[0]?.vector
  if (vector === undefined) return { carriers: [], remainder: 1 }
  const difference = matrix.map((v, k) => v - base.matrix[k]!)
  const movement = leading ? values[0]! - base.values[0]! : modes[0]!.weight
  const firstOrder = quadratic(difference, vector)
  const whole = Math.abs(movement) >= 0.5 * Math.abs(firstOrder) ? movement : firstOrder
  if (!(Math.abs(whole) > 1e-12)) return { carriers: [], remainder: 1 }
  const carriers = Array.from(signals, (signal, i) => {
    let sum = 0
    for (let j = 0; j < n; j++) sum += difference[i * n + j]! * vector[j]!
    return { signal: names[signal] ?? `#${signal}`, share: (vector[i]! * sum) / whole }
  })
  carriers.sort((a, b) => Math.abs(b.share) - Math.abs(a.share))
  const named = carriers.slice(0, mostCarriers)
  return { carriers: named, remainder: 1 - named.reduce((s, c) => s + c.share, 0) }
}
