import { distribution, gridStart, gridStep } from './tracy-widom-table.ts'

/** P(X ≤ s) for the Tracy–Widom law, β = 1: cubic interpolation of the table; 0 and 1 beyond it. */
export function tracyWidomCdf(s: number): number {
  const at = (s - gridStart) / gridStep
  if (at <= 0) return 0
  if (at >= distribution.length - 1) return 1
  const k = Math.floor(at)
  const t = at - k
  const y0 = distribution[k]!
  const y1 = distribution[k + 1]!
  const before = k > 0 ? distribution[k - 1]! : y0
  const after = k + 2 < distribution.length ? distribution[k + 2]! : y1
  const d0 = (y1 - before) / 2
  const d1 = (after - y0) / 2
  const h = t * t * (3 - 2 * t)
  return y0 + (y1 - y0) * h + t * (1 - t) * ((1 - t) * d0 - t * d1)
}

const known = new Map<number, number>()

/**
 * The value that the Tracy–Widom law, β = 1, stays below with probability p (1e-9 < p < 1 − 3e-6; beyond
 * that the end of the table). @throws RangeError outside (0, 1)
 */
export function tracyWidomQuantile(p: number): number {
  if (!(p > 0 && p < 1)) throw new RangeError(`${p} is no probability`)
  const kept = known.get(p)
  if (kept !== undefined) return kept
  let low = gridStart
  let high = gridStart + gridStep * (distribution.length - 1)
  for (let step = 0; step < 60; step++) {
    const middle = (low + high) / 2
    if (tracyWidomCdf(middle) < p) low = middle
    else high = middle
  }
  if (known.size > 64) known.clear()
  known.set(p, high)
  return high
}
