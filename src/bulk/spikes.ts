/**
 * What a window shows of a population eigenvalue ℓ (noise variance 1, q = N/T): below 1 + √q nothing; above it
 * a sample eigenvalue near ℓ(1 + q/(ℓ − 1)) (Baik, Ben Arous & Péché 2005; Baik & Silverstein 2006).
 */
export function sampleOfSpike(spike: number, q: number): number {
  return spike > sightLimit(q) ? spike * (1 + q / (spike - 1)) : (1 + Math.sqrt(q)) ** 2
}

/** Squared overlap of the sample's direction with the true one: (1 − q/(ℓ−1)²)/(1 + q/(ℓ−1)) (Paul 2007). */
export function overlapOfSpike(spike: number, q: number): number {
  return spike > sightLimit(q) ? (1 - q / (spike - 1) ** 2) / (1 + q / (spike - 1)) : 0
}

/** The population eigenvalue that shows at a sample eigenvalue beyond the edge; null at or below the edge. */
export function spikeOfSample(value: number, q: number): number | null {
  const b = value + 1 - q
  const root = b * b - 4 * value
  return value > (1 + Math.sqrt(q)) ** 2 && root >= 0 ? (b + Math.sqrt(root)) / 2 : null
}

/** The smallest population eigenvalue that can be seen at all, in units of the noise variance: 1 + √q. */
export const sightLimit = (q: number): number => 1 + Math.sqrt(q)
