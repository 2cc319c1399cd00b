import type { BulkLaw } from './edges.ts'

const mostSteps = 40

/**
 * Variance of the noise beside `escaped` eigenvalues, from the trace: what is left, but for what each escape
 * has drawn up from the noise under it. An escape at λ stands for the population eigenvalue ℓ, so that
 * σ² = (trace − Σ σ²ℓ(λ/σ²))/(N − k), solved by iteration (Kritchman & Nadler 2009). Leaving the whole λ out
 * instead makes σ² too small, and the next test call noise an escape. `values` largest first.
 */
export function noiseVariance(values: Float64Array, escaped: number, trace: number, law: BulkLaw): number {
  const left = values.length - escaped
  let rest = trace
  for (let k = 0; k < escaped; k++) rest -= values[k]!
  let variance = Math.max(0, rest) / left
  if (escaped === 0 || !(variance > 1e-12 * trace)) return variance
  for (let step = 0; step < mostSteps; step++) {
    let noise = trace
    for (let k = 0; k < escaped; k++) {
      const x = Math.max(law.edges.upper, values[k]! / variance)
      noise -= Math.min(values[k]!, variance * populationSpike(x, law))
    }
    const next = Math.max(0, noise) / left
    if (Math.abs(next - variance) <= 1e-12 * variance) return next
    variance = next
  }
  return variance
}

/** The population eigenvalue that shows at x, at or beyond the upper edge; noise variance 1. */
export function populationSpike(x: number, law: BulkLaw): number {
  const scaled = x * law.stieltjes(x)
  return scaled / (scaled + 1)
}
