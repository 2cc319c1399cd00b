import { correlationCentring } from './correlation-centring.ts'
import type { BulkLaw } from './edges.ts'
import { exponentialCentring } from './exponential-centring.ts'
import { exponentialLaw } from './exponential-memory.ts'
import { type Centring, correctedCentring } from './johnstone.ts'
import { marchenkoPasturLaw } from './marchenko-pastur.ts'

/** What noise of variance 1 on p signals looks like in a window worth `effective` independent frames. */
export interface NoiseModel {
  readonly model: 'marchenko-pastur' | 'exponential'
  law(p: number, effective: number): BulkLaw
  /** Where the largest of its eigenvalues lies in a covariance with means removed. */
  covariance(p: number, effective: number): Centring
  /** The same in a correlation matrix. */
  correlation(p: number, effective: number): Centring
}

/** Frames with which a window determines a covariance: its mean costs one. */
const degrees = (effective: number): number => Math.max(1, effective - 1)

function noiseModel(
  model: NoiseModel['model'],
  law: (p: number, frames: number) => BulkLaw,
  centring: (p: number, frames: number) => Centring,
): NoiseModel {
  return {
    model,
    law,
    covariance: (p, effective) => centring(p, degrees(effective)),
    correlation: (p, effective) => {
      const frames = degrees(effective)
      const { edges, stieltjes } = law(p, frames)
      const steepness = -edges.upper * stieltjes(edges.upper)
      return correlationCentring(centring(p, frames), p, frames, steepness)
    },
  }
}

/** A boxcar window. */
export const boxcarNoise = noiseModel(
  'marchenko-pastur',
  (p, frames) => marchenkoPasturLaw(p / frames),
  (p, frames) => {
    const { centre, scale } = correctedCentring(frames, p)
    return { centre: centre / frames, scale: scale / frames }
  },
)

/**
 * An exponential memory; its load N(1 − a) is written as 2N/T_eff, the same to second order, so that what
 * shortens T_eff widens the bulk.
 */
export const exponentialNoise = noiseModel(
  'exponential',
  (p, frames) => exponentialLaw((2 * p) / frames),
  (p, frames) => exponentialCentring(p, (2 * p) / frames),
)
