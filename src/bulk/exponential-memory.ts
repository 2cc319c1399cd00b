import type { BulkLaw } from './law-table.ts'
import type { Edges } from './marchenko-pastur.ts'

/**
 * Edges of the noise bulk under an exponential memory, q = N(1 − a): the two roots of λ − ln λ = 1 + q, that
 * is −W₀(−e^{−(1+q)}) and −W₋₁(−e^{−(1+q)}), times the variance (Pafka, Potters & Kondor 2004).
 */
export function exponentialEdges(q: number, variance = 1): Edges {
  return {
    lower: variance * root(q, Math.exp(-(1 + q))),
    upper: variance * root(q, 1 + q + Math.sqrt(2 * q)),
  }
}

/** Newton's method on λ − ln λ − 1 − q; convex, so that a start outside the roots comes down to the nearer. */
function root(q: number, start: number): number {
  let x = start
  for (let step = 0; step < 100; step++) {
    const next = x - (x - Math.log(x) - 1 - q) / (1 - 1 / x)
    if (Math.abs(next - x) <= 1e-15 * next) return next
    x = next
  }
  return x
}

/**
 * Density at x, variance 1. The resolvent g obeys x = (q − ln(1 − h))/h with h = q·g: the free sum of
 * rank-one terms of weights (1 − a)aᵏ has the R-transform −ln(1 − qg)/(qg). Solved by Newton's method in the
 * complex plane, walked from the middle of the bulk; the density is |Im h|/(πq).
 */
export function exponentialLaw(q: number): BulkLaw {
  const edges = exponentialEdges(q)
  return {
    ...edges,
    density(x) {
      if (x <= edges.lower || x >= edges.upper) return 0
      let best = 0
      for (const start of [0.3, 0.7, 1, 1.5]) {
        const found = solveResolvent(x, q, start)
        if (found !== null && found > best) best = found
      }
      return best / (Math.PI * q)
    },
  }
}

/** Imaginary part of the root h of x·h + ln(1 − h) − q, started at (1 − 1/x) + i·start; null without one. */
function solveResolvent(x: number, q: number, start: number): number | null {
  let re = 1 - 1 / x
  let im = (start * Math.sqrt(2 * q)) / x
  for (let step = 0; step < 200; step++) {
    const u = 1 - re
    const square = u * u + im * im
    const fRe = x * re + 0.5 * Math.log(square) - q
    const fIm = x * im + Math.atan2(-im, u)
    const dRe = x - u / square
    const dIm = -im / square
    const norm = dRe * dRe + dIm * dIm
    if (norm === 0) return null
    const sRe = (fRe * dRe + fIm * dIm) / norm
    const sIm = (fIm * dRe - fRe * dIm) / norm
    re -= sRe
    im -= sIm
    if (Math.abs(sRe) + Math.abs(sIm) < 1e-13) return im > 1e-12 ? im : null
  }
  return null
}
