/** Entries this close to the largest, relative to it, count as equally large. */
const tie = 1e-9

/**
 * Turns the vector of n entries at `start` so that its entry of largest magnitude is positive; of equally
 * large ones the first, so that rounding does not choose the sign.
 */
export function pointUp(entries: Float64Array, start: number, n: number): void {
  let largest = 0
  for (let i = start; i < start + n; i++) largest = Math.max(largest, Math.abs(entries[i]!))
  let at = start
  while (at < start + n - 1 && Math.abs(entries[at]!) < largest * (1 - tie)) at++
  if (entries[at]! < 0) for (let i = start; i < start + n; i++) entries[i] = -entries[i]!
}
