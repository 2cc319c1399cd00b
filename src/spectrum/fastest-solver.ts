import { PlainSolver } from './plain-solver.ts'
import { SimdSolver } from './simd-solver.ts'
import type { SymmetricSolver } from './spectrum.ts'

/** The fastest solver that this engine runs. Each holds its own scratch: one for each ensemble. */
export function fastestSolver(): SymmetricSolver {
  return SimdSolver.supported ? new SimdSolver() : new PlainSolver()
}
