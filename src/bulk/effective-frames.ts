/**
 * Independent frames that determine a correlation as well as `frames` frames of signals with a common lag-1
 * autocorrelation r, |r| < 1: T(1 − r²)/(1 + r²) (Bartlett 1935).
 *
 * @throws RangeError for |r| ≥ 1
 */
export function effectiveFrames(frames: number, r: number): number {
  if (!(Math.abs(r) < 1)) throw new RangeError(`an autocorrelation inside (−1, 1) is needed, not ${r}`)
  return (frames * (1 - r * r)) / (1 + r * r)
}
