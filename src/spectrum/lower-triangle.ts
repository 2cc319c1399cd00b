import { SpectrumError } from './spectrum-error.ts'

/**
 * The power of two that brings the largest entry of the lower triangle into [1, 2); 1 for a zero matrix.
 * Dividing by it rounds nothing, and the squares of what is left neither overflow nor vanish.
 *
 * @throws SpectrumError `not-finite` when an entry of the lower triangle is not finite, `bad-order`
 */
export function powerOfTwoScale(matrix: Float64Array, n: number): number {
  if (!Number.isInteger(n) || n < 0 || matrix.length < n * n) throw new SpectrumError('bad-order', n)
  let largest = 0
  let spoilt = 0
  for (let i = 0; i < n; i++) {
    const row = i * n
    for (let j = 0; j <= i; j++) {
      const x = matrix[row + j]!
      const size = Math.abs(x)
      if (size > largest) largest = size
      spoilt += x - x
    }
  }
  if (spoilt !== 0) throw new SpectrumError('not-finite', n)
  return largest > 0 ? 2 ** Math.max(-1074, Math.floor(Math.log2(largest))) : 1
}
