/**
 * Quantile of the standard normal law at 1 − p, for 1e-300 < p < 1: rational start (Abramowitz & Stegun
 * 1964, 26.2.23, from memory) and Newton steps on the upper tail.
 */
export function upperNormal(p: number): number {
  if (p > 0.5) return -upperNormal(1 - p)
  const t = Math.sqrt(-2 * Math.log(p))
  let z =
    t - (2.515517 + t * (0.802853 + t * 0.010328)) / (1 + t * (1.432788 + t * (0.189269 + t * 0.001308)))
  for (let k = 0; k < 4; k++) {
    const density = Math.exp(-0.5 * z * z) / Math.sqrt(2 * Math.PI)
    z += (normalTail(z) - p) / density
  }
  return z
}

/** P(Z > z) for z ≥ 0: series for small z, Lentz's continued fraction of Mills' ratio for large. */
export function normalTail(z: number): number {
  const density = Math.exp(-0.5 * z * z) / Math.sqrt(2 * Math.PI)
  if (z < 2.5) {
    let term = z
    let sum = z
    for (let k = 1; k < 60; k++) {
      term *= (z * z) / (2 * k + 1)
      sum += term
    }
    return 0.5 - density * sum
  }
  let fraction = 0
  for (let k = 80; k >= 1; k--) fraction = k / (z + fraction)
  return density / (z + fraction)
}

/**
 * How rare one window must be so that `statistics` two-faced watchers together page once in
 * `framesPerFalsePage` frames. A statistic of a sliding window is locally a process whose correlation
 * falls by `turnover` a frame (boxcar 1/T, exponential memory −ln a), and such a process visits a high
 * level z in clumps at the rate turnover·z²·P(Z > z) (Aldous 1989, Probability approximations via the
 * Poisson clumping heuristic; from memory). So one window's length counts as z² independent ones, about 10.
 * The asked-for run of frames beyond the limit thins the clumps further and is not counted: the limits are
 * on the careful side. Never above 0.02.
 */
export function windowTail(framesPerFalsePage: number, turnover: number, statistics: number): number {
  const windows = Math.max(1e-9, framesPerFalsePage * turnover * statistics)
  let p = 0.02
  for (let k = 0; k < 50; k++) {
    const z = Math.max(1, upperNormal(p))
    p = Math.min(0.02, Math.max(1e-250, 1 / (windows * z * z)))
  }
  return p
}

/**
 * Level that a squared distance passes with probability p, from draws of it. The upper fifth is taken as
 * exponential: a sum of squared normals has an exponential tail whose rate is set by its largest term
 * (Zolotarev 1961), the case of shape 0 of the generalised Pareto law (Pickands 1975). Never below the
 * largest draw.
 */
export function exponentialTail(draws: Float64Array, p: number): number {
  const sorted = draws.slice().sort()
  const m = sorted.length
  const from = Math.floor(0.8 * m)
  const threshold = sorted[from]!
  let excess = 0
  for (let k = from + 1; k < m; k++) excess += sorted[k]! - threshold
  const rate = excess / Math.max(1, m - from - 1)
  return Math.max(sorted[m - 1]!, threshold + rate * Math.log(Math.max(1, 0.2 / p)))
}
