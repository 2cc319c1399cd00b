import type { BulkLaw } from './law-table.ts'

export interface Edges {
  readonly lower: number
  readonly upper: number
}

/** Edges σ²(1 ± √q)² of the noise bulk, q = N/T (Marchenko & Pastur 1967). For q > 1 a share 1 − 1/q lies on 0. */
export function marchenkoPasturEdges(q: number, variance = 1): Edges {
  const root = Math.sqrt(q)
  return { lower: variance * (1 - root) ** 2, upper: variance * (1 + root) ** 2 }
}

/** Density √((b − x)(x − a))/(2πσ²qx) between the edges, 0 outside (Marchenko & Pastur 1967). */
export function marchenkoPasturDensity(x: number, q: number, variance = 1): number {
  const { lower, upper } = marchenkoPasturEdges(q, variance)
  if (x <= lower || x >= upper || x <= 0) return 0
  return Math.sqrt((upper - x) * (x - lower)) / (2 * Math.PI * variance * q * x)
}

/** The first four moments of the law with variance 1: 1, 1 + q, 1 + 3q + q², 1 + 6q + 6q² + q³. */
export const marchenkoPasturMoments = (q: number): readonly [number, number, number, number] => [
  1,
  1 + q,
  1 + 3 * q + q * q,
  1 + 6 * q + 6 * q * q + q ** 3,
]

export function marchenkoPasturLaw(q: number): BulkLaw {
  return { ...marchenkoPasturEdges(q), density: (x) => marchenkoPasturDensity(x, q) }
}
