import { fileURLToPath } from 'node:url'
import { parseArgs } from 'node:util'
import { PlainSolver } from '../src/spectrum/plain-solver.ts'
import { SimdSolver } from '../src/spectrum/simd-solver.ts'
import type { SymmetricSolver } from '../src/spectrum/spectrum.ts'
import { BoxcarWindow } from '../src/window/boxcar-window.ts'
import { baselineEnvironment, baselinePython, describeMachine, median, run, spread } from './support.ts'

/**
 * The full spectrum every frame, N signals over T = 2N frames: one frame in and one out of the moments, the
 * correlation, all eigenvalues. On the SIMD kernels, on their plain twin and in numpy and scipy on one BLAS
 * thread (bench/baseline/spectra.py), interleaved.
 */
const { values } = parseArgs({ options: { rounds: { type: 'string', default: '5' } } })
const rounds = Number(values.rounds)
const script = fileURLToPath(new URL('../../bench/baseline/spectra.py', import.meta.url))
const framesOf: readonly (readonly [n: number, frames: number])[] = [
  [50, 2000],
  [100, 800],
  [200, 200],
  [500, 40],
]

/** Median milliseconds of a frame by stage. */
interface Stages {
  readonly exchange: number
  readonly correlation: number
  readonly values: number
  readonly all: number
}

/** Entries in (−1.1, 1.1) with a common part, from a linear congruential generator (Knuth's MMIX constants). */
function frameSource(n: number): (x: Float64Array) => void {
  let state = 4n
  const draw = (): number => {
    state = (state * 6364136223846793005n + 1442695040888963407n) & 0xffffffffffffffffn
    return Number(state >> 11n) / 2 ** 52 - 1
  }
  return (x) => {
    const common = 0.1 * draw()
    for (let i = 0; i < n; i++) x[i] = draw() + common
  }
}

function ours(solver: SymmetricSolver, n: number, frames: number): Stages {
  const window = new BoxcarWindow(2 * n)
  const next = frameSource(n)
  const x = new Float64Array(n)
  const present = new Uint8Array(n).fill(1)
  const matrix = new Float64Array(n * n)
  for (let k = 0; k < 2 * n; k++) {
    next(x)
    window.push(x, present)
  }
  const active = window.active()
  const taken: Record<keyof Stages, number[]> = { exchange: [], correlation: [], values: [], all: [] }
  for (let k = 0; k < frames; k++) {
    next(x)
    const start = performance.now()
    window.push(x, present)
    const exchanged = performance.now()
    window.correlation(matrix, active)
    const filled = performance.now()
    solver.solve(matrix, n, 0)
    const done = performance.now()
    taken.exchange.push(exchanged - start)
    taken.correlation.push(filled - exchanged)
    taken.values.push(done - filled)
    taken.all.push(done - start)
  }
  return {
    exchange: median(taken.exchange),
    correlation: median(taken.correlation),
    values: median(taken.values),
    all: median(taken.all),
  }
}

function theirs(python: string, n: number, frames: number): number {
  const [, milliseconds] = run(python, [script, String(n), String(frames)], baselineEnvironment())
    .trim()
    .split(' ')
  return Number(milliseconds)
}

const python = baselinePython()
console.log(`${new Date().toISOString().slice(0, 10)}, ${describeMachine(python)}`)
if (!SimdSolver.supported) throw new Error('this engine does not run the SIMD kernels')
for (const [n, frames] of framesOf) {
  const script: number[] = []
  const simd: Stages[] = []
  const plain: Stages[] = []
  for (let round = 0; round < rounds; round++) {
    script.push(theirs(python, n, frames))
    simd.push(ours(new SimdSolver(), n, frames))
    plain.push(ours(new PlainSolver(), n, frames))
  }
  console.log(`\nN = ${n}, ms a frame: median [range] of ${rounds} interleaved rounds of ${frames} frames`)
  console.log(`  numpy dsyr2 + dsyevd ${spread(script)}`)
  for (const [name, list] of Object.entries({ 'SIMD kernels': simd, 'TypeScript twin': plain })) {
    const of = (stage: keyof Stages): string => median(list.map((stages) => stages[stage])).toFixed(3)
    console.log(
      `  ${name.padEnd(20)} ${spread(list.map(({ all }) => all))}: exchange ${of('exchange')}, ` +
        `correlation ${of('correlation')}, eigenvalues ${of('values')}; ` +
        `ratio ${spread(list.map(({ all }, k) => script[k]! / all))}`,
    )
  }
}
