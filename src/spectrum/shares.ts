/** Σλ, the trace. */
export function traceOf(values: Float64Array): number {
  let trace = 0
  for (let i = 0; i < values.length; i++) trace += values[i]!
  return trace
}

/** λ1 over the trace, λ largest first; 0 when the trace is not positive. */
export function leadingShare(values: Float64Array): number {
  return absorptionRatio(values, 1)
}

/**
 * Share of the variance in the `modes` leading modes, λ largest first; by default a fifth of them, as is
 * usual, at least one (Kritzman, Li, Page & Rigobon 2011). 0 when the trace is not positive.
 */
export function absorptionRatio(
  values: Float64Array,
  modes: number = Math.max(1, Math.round(values.length / 5)),
): number {
  const trace = traceOf(values)
  return trace > 0 ? traceOf(values.subarray(0, modes)) / trace : 0
}
