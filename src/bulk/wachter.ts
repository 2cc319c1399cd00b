import type { Edges } from './edges.ts'

/**
 * Edges of C0^{-1/2} C C0^{-1/2} when nothing changed, y1 = N/T, y2 = N/T0 < 1:
 * [(1 ± √(y1 + y2 − y1y2))/(1 − y2)]² (Wachter 1978). @throws RangeError for y2 ≥ 1
 */
export function wachterEdges(y1: number, y2: number): Edges {
  if (!(y2 < 1)) throw new RangeError('the reference must hold more frames than there are signals')
  const h = Math.sqrt(y1 + y2 - y1 * y2)
  return { lower: ((1 - h) / (1 - y2)) ** 2, upper: ((1 + h) / (1 - y2)) ** 2 }
}
