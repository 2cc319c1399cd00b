/**
 * Imaginary part of the dilogarithm Li₂(x + iy), principal branch, cut along the real axis from 1. By
 * reflection and inversion to |z| ≤ 1, Re z ≤ ½, there the Bernoulli series in u = −ln(1 − z)
 * (Lewin 1981, Polylogarithms and Associated Functions, chapter 1).
 */
export function imaginaryDilogarithm(x: number, y: number): number {
  if (y === 0) return 0
  const size2 = x * x + y * y
  if (size2 > 1) {
    // Li₂(z) = −Li₂(1/z) − π²/6 − ½ ln²(−z)
    const logSize = 0.5 * Math.log(size2)
    return -imaginaryDilogarithm(x / size2, -y / size2) - logSize * Math.atan2(-y, -x)
  }
  if (x > 0.5) {
    // Li₂(z) = −Li₂(1 − z) + π²/6 − ln z ln(1 − z)
    const rest = 1 - x
    const logZ = 0.5 * Math.log(size2)
    const logRest = 0.5 * Math.log(rest * rest + y * y)
    const crossed = logZ * Math.atan2(-y, rest) + logRest * Math.atan2(y, x)
    return -series(rest, -y) - crossed
  }
  return series(x, y)
}

/** B₂ₙ/(2n + 1)!, n = 1 … 9. */
const bernoulli = [
  1 / 36,
  -1 / 3600,
  1 / 211_680,
  -1 / 10_886_400,
  1 / 526_901_760,
  -691 / (2730 * 6_227_020_800),
  7 / (6 * 1_307_674_368_000),
  -3617 / (510 * 355_687_428_096_000),
  43_867 / (798 * 121_645_100_408_832_000),
] as const

/** Im(u − u²/4 + Σ B₂ₙ u²ⁿ⁺¹/(2n + 1)!), u = −ln(1 − z). */
function series(x: number, y: number): number {
  const re = -0.5 * Math.log((1 - x) * (1 - x) + y * y)
  const im = -Math.atan2(-y, 1 - x)
  const squareRe = re * re - im * im
  const squareIm = 2 * re * im
  let powerRe = re
  let powerIm = im
  let sum = im - squareIm / 4
  for (const factor of bernoulli) {
    const next = powerRe * squareRe - powerIm * squareIm
    powerIm = powerRe * squareIm + powerIm * squareRe
    powerRe = next
    sum += factor * powerIm
  }
  return sum
}
