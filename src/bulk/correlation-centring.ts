import type { Centring } from './johnstone.ts'

/** Mean and variance of the Tracy–Widom law, β = 1 (Bornemann 2010). */
const lawMean = -1.206533574582
const lawVariance = 1.607781034581

/** Fitted to simulated noise, p = 5 … 200, n = 19 … 399; see `correlationCentring`. */
const meanDamping = 0.85
const varianceDamping = 0.64

/**
 * From the largest eigenvalue of a covariance of noise to that of its correlation matrix. For normal noise
 * the deviations of the signals are independent of the correlations, so that what they add can be taken out:
 * by second-order perturbation with delocalised vectors, to the mean (2λ₊/n)(λ₊|m| − 1), m the Stieltjes
 * transform at the edge, and to the variance 6λ₊²/(n(p + 2)). Both are of the law's own order in small
 * samples, and then the orders beyond count too: the first is damped by exp(−0.85 x²), x in standard
 * deviations, the second by 0.64, both fitted to simulations (test/bulk/reference/correlation-edge.py): from
 * p = 10 on the mean lies within a tenth of a deviation and the deviation within 8 %. For p = 3, T = 20 the limit
 * of 5 % is passed by 3.0 %, for p = 5, T = 20 by 4.7 %, for p = 20, T = 1000 by 5.0 % (20,000 and 2,000 draws).
 * Asymptotically nothing is left of either correction (Bao, Pan & Zhou 2012).
 *
 * `covariance` in units of the noise variance; `frames` effective; `steepness` is λ₊|m(λ₊)|.
 */
export function correlationCentring(
  covariance: Centring,
  p: number,
  frames: number,
  steepness: number,
): Centring {
  const { centre, scale } = covariance
  const variance = scale * scale * lawVariance
  const mean = centre + lawMean * scale
  const shift = ((2 * mean) / frames) * (steepness - 1)
  const damped = shift * Math.exp((-meanDamping * shift * shift) / variance)
  const added = (varianceDamping * 6 * mean * mean) / (frames * (p + 2))
  const scaleLeft = scale * Math.sqrt(Math.max(0.1, 1 - added / variance))
  return { centre: mean - damped - lawMean * scaleLeft, scale: scaleLeft }
}
