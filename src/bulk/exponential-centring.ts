import { exponentialEdges } from './exponential-memory.ts'
import type { Centring } from './johnstone.ts'

/**
 * Where the largest noise eigenvalue lies under an exponential memory of load q = N(1 − a), variance 1, for
 * p = N signals. Derived here, since no published centring was known to the author:
 *
 * The scale is that of any edge at which the density ends like a square root (El Karoui 2007; Lee & Schnelli
 * 2016): with z(m) of exponential-memory.ts, z′ = 0 and σ = (z″/2)^{1/3} p^{−2/3}. There y = 1/λ₊ and
 * z″ = q² λ₊³/(λ₊ − 1), so σ = λ₊ (q²/(2p²(λ₊ − 1)))^{1/3}.
 *
 * The centre is λ₊ moved by what n − ½ and p − ½ (Ma 2012) move the Marchenko–Pastur edge. Written by z that
 * is −z″m²/(4p), and here −λ₊(λ₊ − 1)/(4p). The coverage is held against simulated noise in the tests.
 */
export function exponentialCentring(p: number, load: number): Centring {
  const { upper } = exponentialEdges(load)
  const excess = upper - 1
  return {
    centre: upper - (upper * excess) / (4 * p),
    scale: upper * Math.cbrt((load * load) / (2 * p * p * excess)),
  }
}
