/**
 * The smallest population eigenvalue that a window can show at all, in units of the noise variance: 1 + √q,
 * q = N/T (Baik, Ben Arous & Péché 2005).
 */
export const sightLimit = (q: number): number => 1 + Math.sqrt(q)

/**
 * Where a population eigenvalue ℓ shows in a boxcar window, noise variance 1, q = N/T: at ℓ(1 + q/(ℓ − 1))
 * beyond the sight limit, below it at the edge (Baik, Ben Arous & Péché 2005; Baik & Silverstein 2006).
 */
export function sampleOfSpike(spike: number, q: number): number {
  return spike > sightLimit(q) ? spike * (1 + q / (spike - 1)) : (1 + Math.sqrt(q)) ** 2
}

/** Squared overlap of the sample's direction with the true one: (1 − q/(ℓ−1)²)/(1 + q/(ℓ−1)) (Paul 2007). */
export function overlapOfSpike(spike: number, q: number): number {
  return spike > sightLimit(q) ? (1 - q / (spike - 1) ** 2) / (1 + q / (spike - 1)) : 0
}

/** The population eigenvalue that shows at a sample eigenvalue; null at the edge or below, where none does. */
export function spikeOfSample(value: number, q: number): number | null {
  if (!(value > (1 + Math.sqrt(q)) ** 2)) return null
  const b = value + 1 - q
  return (b + Math.sqrt(Math.max(0, b * b - 4 * value))) / 2
}
