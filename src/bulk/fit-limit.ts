import type { Bulk } from './bulk.ts'

/**
 * Largest Kolmogorov–Smirnov distance that chance explains, for n signals: 4/n. Eigenvalues repel each other
 * and lie far more evenly than independent draws, so that the distance of true noise from its law falls like
 * 1/n: in 3,400 simulated windows of normal noise, n = 5 … 100, n/T = 0.1 … 2, it was at most 3.6/n.
 */
export const fitLimit = (n: number): number => 4 / n

/** Does the law not describe the bulk of n signals? Then the resampled edge should take its place. */
export const poorFit = (bulk: Bulk, n: number): boolean => bulk.fit > fitLimit(n)
