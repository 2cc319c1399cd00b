/**
 * Effective rank exp(−Σ p ln p), p = λ/Σλ, from 1 to N (Roy & Vetterli 2007). Values that rounding has made
 * negative count as 0. 0 when no value is positive.
 */
export function effectiveRank(values: Float64Array): number {
  let trace = 0
  for (let i = 0; i < values.length; i++) trace += Math.max(0, values[i]!)
  if (!(trace > 0)) return 0
  let entropy = 0
  for (let i = 0; i < values.length; i++) {
    const p = values[i]! / trace
    if (p > 0) entropy -= p * Math.log(p)
  }
  return Math.exp(entropy)
}
