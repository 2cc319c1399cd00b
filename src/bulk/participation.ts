/**
 * Participation ratio (Σv²)²/Σv⁴ of the n entries at `start`, which is 1/Σv⁴ for a unit vector: about how
 * many signals share it, from 1 to n (Bell & Dean 1970, from memory). 0 for a vector of zeros.
 */
export function participationRatio(
  entries: Float64Array,
  start = 0,
  n: number = entries.length - start,
): number {
  let squares = 0
  let fourths = 0
  for (let i = start; i < start + n; i++) {
    const square = entries[i]! * entries[i]!
    squares += square
    fourths += square * square
  }
  return fourths > 0 ? (squares * squares) / fourths : 0
}
