import { imaginaryDilogarithm } from './complex-dilogarithm.ts'
import type { BulkLaw, Edges } from './edges.ts'

/**
 * Eigenvalues of a covariance of N independent signals of variance 1 under an exponential memory with
 * weights (1 − a)aᵏ, for `load` = N(1 − a), which is 1/Q of Pafka, Potters & Kondor (2004). To second order
 * in 1 − a it is −N ln a, and 2N/T_eff with T_eff = (1 + a)/(1 − a).
 *
 * With m the Stieltjes transform and y = 1 + load·m, the self-consistent equation of weighted frames,
 * z = −1/m + (1/N)Σ N wₖ/(1 + N wₖ m) (Silverstein & Bai 1995), sums up to z = (ln y − load)/(y − 1). Inside
 * the bulk y = θ e^{iθ}/(x sin θ), where θ in (0, π) solves ln(θ/sin θ) − θ cot θ = load − (x − ln x), and
 * the density is θ/(π load x). The edges are θ = 0: the two roots of λ − ln λ = 1 + load.
 */
export function exponentialEdges(load: number, variance = 1): Edges {
  return { lower: variance * edgeBelow(load), upper: variance * (1 + excessAbove(load)) }
}

/** −W0(−e^{−(1+load)}), by Newton's method from the left in ln λ, where it cannot overshoot. */
function edgeBelow(load: number): number {
  if (load === 0) return 1
  if (load > 30) return Math.exp(-(1 + load) + Math.exp(-(1 + load)))
  let t = -(1 + load)
  for (let step = 0; step < 100; step++) {
    // e^t − t − 1 − load = 0, written for precision near t = 0
    const value = Math.expm1(t) - t - load
    const next = t - value / Math.expm1(t)
    if (!(next > t)) break
    t = next
  }
  return Math.exp(t)
}

/** −W−1(−e^{−(1+load)}) − 1: δ − ln(1 + δ) = load by Newton's method from the right. */
function excessAbove(load: number): number {
  let delta = load + Math.sqrt(2 * load) + 1e-300
  for (let step = 0; step < 100; step++) {
    const next = delta - ((delta - Math.log1p(delta) - load) * (1 + delta)) / delta
    if (!(next < delta)) break
    delta = next
  }
  return Math.max(0, delta)
}

/** θ in [0, π) at x inside the edges; 0 outside. */
function angleAt(x: number, load: number): number {
  const wanted = load - (x - Math.log(x))
  if (!(wanted > -1)) return 0
  let low = 0
  let high = Math.PI
  let theta = Math.min(3, Math.sqrt(2 * (wanted + 1)))
  for (let step = 0; step < 60; step++) {
    const cotangent = 1 / Math.tan(theta)
    const value = Math.log(theta / Math.sin(theta)) - theta * cotangent - wanted
    if (value < 0) low = theta
    else high = theta
    const slope = 1 / theta - 2 * cotangent + theta * (1 + cotangent * cotangent)
    let next = theta - value / slope
    if (!(next > low && next < high)) next = (low + high) / 2
    if (Math.abs(next - theta) <= 4e-16 * theta) return next
    theta = next
  }
  return theta
}

export function exponentialDensity(x: number, load: number): number {
  return x > 0 ? angleAt(x, load) / (Math.PI * load * x) : 0
}

/**
 * P(λ ≤ x) = [θ/load + Im Li₂(1 − y)/load + arg(y − 1)]/π: the density's integral −∫m dz/π done in closed
 * form along z(y). No mass lies at 0, since the memory has no end.
 */
export function exponentialCdf(x: number, load: number, edges: Edges = exponentialEdges(load)): number {
  if (!(x > edges.lower)) return 0
  if (x >= edges.upper) return 1
  const theta = angleAt(x, load)
  if (theta === 0) return x < 1 ? 0 : 1
  const re = theta / (x * Math.tan(theta))
  const im = theta / x
  const sum = (theta + imaginaryDilogarithm(1 - re, -im)) / load + Math.atan2(im, re - 1)
  return Math.min(1, Math.max(0, sum / Math.PI))
}

export function exponentialLaw(load: number): BulkLaw {
  const edges = exponentialEdges(load)
  return {
    edges,
    atZero: 0,
    cdf: (x) => exponentialCdf(x, load, edges),
    stieltjes: (x) => -stepBelowOne(x, load) / load,
  }
}

/** d = 1 − y in (0, 1 − 1/x] with ln(1 − d) − load = −x d: concave in d, Newton's method from the left. */
function stepBelowOne(x: number, load: number): number {
  let d = 0
  for (let step = 0; step < 100; step++) {
    const slope = x - 1 / (1 - d)
    if (!(slope > 0)) break
    const next = d + (load - x * d - Math.log1p(-d)) / slope
    if (!(next > d)) break
    d = next
  }
  return d
}
