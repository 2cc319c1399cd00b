import { readFileSync } from 'node:fs'
import fc from 'fast-check'
import { EigenvalueDecomposition, Matrix } from 'ml-matrix'
import { describe, expect, it } from 'vitest'
import { fastestSolver } from '../../src/spectrum/fastest-solver.ts'
import { frobeniusCeiling } from '../../src/spectrum/frobenius.ts'
import { PlainSolver } from '../../src/spectrum/plain-solver.ts'
import { SimdSolver } from '../../src/spectrum/simd-solver.ts'
import type { Spectrum } from '../../src/spectrum/spectrum.ts'
import { SpectrumError } from '../../src/spectrum/spectrum-error.ts'
import { wasserstein2 } from '../../src/spectrum/wasserstein.ts'
import { matrices, type Square } from './reference/matrices.ts'

const figures = JSON.parse(
  readFileSync(new URL('./reference/eigenvalues.json', import.meta.url), 'utf8'),
) as { values: Record<string, number[]> }

const names = Object.keys(matrices)
const largest = (values: Iterable<number>): number => Math.max(...[...values].map(Math.abs))

/** Numbers below this have lost digits of their own. */
const leastPrecise = 1e-290

/** Symmetric matrices of order 1 to 12 with entries of very different sizes, and many equal or zero ones. */
const symmetric: fc.Arbitrary<Square> = fc.integer({ min: 1, max: 12 }).chain((n) =>
  fc
    .array(
      fc.oneof(
        fc.constantFrom(0, 1, -1),
        fc.double({ min: -1, max: 1, noNaN: true }),
        fc.double({ min: -1e-9, max: 1e-9, noNaN: true }),
        fc.double({ min: -1e6, max: 1e6, noNaN: true }),
      ),
      { minLength: (n * (n + 1)) / 2, maxLength: (n * (n + 1)) / 2 },
    )
    .map((triangle) => {
      const entries = new Float64Array(n * n)
      let next = 0
      for (let i = 0; i < n; i++) {
        for (let j = 0; j <= i; j++) entries[i * n + j] = entries[j * n + i] = triangle[next++]!
      }
      return { n, entries }
    })
    .filter(({ entries }) => largest(entries) === 0 || largest(entries) > leastPrecise),
)

const fromLower = (n: number, below: readonly (readonly [i: number, j: number, x: number])[]): Square => {
  const entries = new Float64Array(n * n)
  for (const [i, j, x] of below) entries[i * n + j] = entries[j * n + i] = x
  return { n, entries }
}

/** Found by long runs of the property tests: each broke an earlier form of the solvers. */
const awkward: Readonly<Record<string, Square>> = {
  'squares that vanish': fromLower(3, [
    [1, 0, -1],
    [2, 0, 1.9698107601837745e-159],
  ]),
  'a coupling of the smallest number there is': fromLower(3, [
    [1, 0, -5e-324],
    [1, 1, 1],
  ]),
  'pairs that sweeps leave standing': fromLower(8, [
    [1, 0, -1],
    [3, 0, -1],
    [3, 1, -1],
    [3, 2, -1],
    [4, 3, -1],
    [6, 2, -1],
    [6, 5, -1],
    [7, 6, -1],
  ]),
  'a threefold value in three blocks': fromLower(6, [
    [1, 0, -1],
    [2, 1, -2.556550284588886e-32],
    [3, 2, 3.337594520396004e-16],
    [3, 3, 0],
    [4, 3, 1],
    [5, 2, -1],
    [5, 4, 5e-324],
  ]),
  'couplings over forty decades': fromLower(7, [
    [1, 0, 5.46330702355987e-128],
    [2, 1, 567715.0595261405],
    [3, 2, 0.5676532916576202],
    [3, 3, 1.832921390432449e-39],
    [6, 2, 3.823985513217743e-45],
  ]),
  'a double value whose solve grows twice': fromLower(8, [
    [1, 0, 1.7411688757462684e-10],
    [3, 2, 0],
    [4, 3, 1],
    [4, 1, 1],
    [2, 1, 0],
    [4, 2, -1],
    [5, 1, 1],
    [6, 4, -1],
    [7, 0, -1],
    [7, 1, -2.9797907792180327e-19],
  ]),
}

/** Largest entry of A v − λ v over all modes, and of V Vᵀ − 1. */
function flaws({ n, entries }: Square, { values, vectors, modes }: Spectrum) {
  let residual = 0
  let overlap = 0
  for (let k = 0; k < modes; k++) {
    for (let i = 0; i < n; i++) {
      let sum = 0
      for (let j = 0; j < n; j++) sum += entries[i * n + j]! * vectors[k * n + j]!
      residual = Math.max(residual, Math.abs(sum - values[k]! * vectors[k * n + i]!))
    }
    for (let l = 0; l <= k; l++) {
      let sum = k === l ? -1 : 0
      for (let i = 0; i < n; i++) sum += vectors[k * n + i]! * vectors[l * n + i]!
      overlap = Math.max(overlap, Math.abs(sum))
    }
  }
  return { residual, overlap }
}

it('this engine runs the kernels, and the fastest solver is theirs', () => {
  expect(SimdSolver.supported).toBe(true)
  expect(fastestSolver()).toBeInstanceOf(SimdSolver)
})

describe.each([
  ['PlainSolver', () => new PlainSolver()],
  ['SimdSolver', () => new SimdSolver()],
] as const)('%s', (_name, make) => {
  const solver = make()

  it.each(names)('agrees with numpy to 1e-10·λ1: %s', (name) => {
    const { n, entries } = matrices[name]!()
    const expected = figures.values[name]!
    const { values } = solver.solve(entries, n, 0)
    expect(values.length).toBe(expected.length)
    const worst = largest(expected.map((value, i) => value - values[i]!))
    expect(worst / largest(expected)).toBeLessThan(1e-10)
  })

  it.each(names)('agrees with ml-matrix to 1e-10·λ1: %s', (name) => {
    const { n, entries } = matrices[name]!()
    const scale = largest(entries)
    const rows = Array.from({ length: n }, (_, i) =>
      Array.from(entries.subarray(i * n, i * n + n), (x) => x / scale),
    )
    const expected = new EigenvalueDecomposition(new Matrix(rows), { assumeSymmetric: true }).realEigenvalues
    const sorted = [...expected].sort((a, b) => b - a)
    const { values } = solver.solve(entries, n, 0)
    const worst = largest(sorted.map((value, i) => value - values[i]! / scale))
    expect(worst / largest(sorted)).toBeLessThan(1e-10)
  })

  it.each(names)('gives orthonormal vectors with small residuals, leading ones and all: %s', (name) => {
    const matrix = matrices[name]!()
    for (const modes of [1, 5, matrix.n]) {
      const spectrum = solver.solve(matrix.entries, matrix.n, modes)
      expect(spectrum.modes).toBe(Math.min(modes, matrix.n))
      const { residual, overlap } = flaws(matrix, spectrum)
      expect(residual / largest(spectrum.values)).toBeLessThan(1e-12)
      expect(overlap).toBeLessThan(1e-11)
    }
  })

  it.each(Object.keys(awkward))('solves what random search found hard: %s', (name) => {
    const matrix = awkward[name]!
    const spectrum = solver.solve(matrix.entries, matrix.n, matrix.n)
    const { residual, overlap } = flaws(matrix, spectrum)
    expect(residual / largest(spectrum.values)).toBeLessThan(1e-13)
    expect(overlap).toBeLessThan(1e-13)
  })

  it('preserves trace and Frobenius norm, and solves every small matrix (property)', () => {
    fc.assert(
      fc.property(symmetric, (matrix) => {
        const { n, entries } = matrix
        const spectrum = solver.solve(entries, n, n)
        const size = Math.max(largest(spectrum.values), Number.MIN_VALUE)
        let trace = 0
        for (let i = 0; i < n; i++) trace += entries[i * n + i]! / size
        const sum = spectrum.values.reduce((s, v) => s + v / size, 0)
        expect(Math.abs(sum - trace)).toBeLessThan(1e-12)
        const frobenius = entries.reduce((s, v) => s + (v / size) ** 2, 0)
        const squares = spectrum.values.reduce((s, v) => s + (v / size) ** 2, 0)
        expect(Math.abs(squares - frobenius)).toBeLessThan(1e-11)
        const { residual, overlap } = flaws(matrix, spectrum)
        expect(residual / size).toBeLessThan(1e-12)
        expect(overlap).toBeLessThan(1e-11)
        for (let i = 1; i < n; i++) expect(spectrum.values[i]).toBeLessThanOrEqual(spectrum.values[i - 1]!)
      }),
      { numRuns: 300, seed: 11 },
    )
  })

  it('W2 of two spectra never exceeds ‖A − B‖_F/√n (property; Hoffman & Wielandt 1953)', () => {
    const pair = fc.tuple(symmetric, symmetric).filter(([a, b]) => a.n === b.n)
    fc.assert(
      fc.property(pair, ([a, b]) => {
        const w2 = wasserstein2(
          solver.solve(a.entries, a.n, 0).values,
          solver.solve(b.entries, b.n, 0).values,
        )
        const ceiling = frobeniusCeiling(a.entries, b.entries, a.n)
        expect(w2).toBeLessThanOrEqual(ceiling * (1 + 1e-12) + 1e-12 * largest(a.entries))
      }),
      { numRuns: 200, seed: 12 },
    )
  })

  it('handles orders 0, 1 and 2', () => {
    expect(solver.solve(new Float64Array(0), 0, 3)).toMatchObject({ n: 0, modes: 0 })
    const one = solver.solve(Float64Array.of(-3), 1, 5)
    expect([...one.values, ...one.vectors]).toEqual([-3, 1])
    const two = solver.solve(Float64Array.of(2, 9, 1, 2), 2, 2)
    expect(two.values[0]).toBeCloseTo(3, 14)
    expect(two.values[1]).toBeCloseTo(1, 14)
    expect(Math.abs(two.vectors[0]! - Math.SQRT1_2)).toBeLessThan(1e-14)
    expect(Math.abs(two.vectors[2]! - Math.SQRT1_2)).toBeLessThan(1e-14)
  })

  it.each([1, 3, 40])('handles the zero matrix and the identity of order %i', (n) => {
    const zero = { n, entries: new Float64Array(n * n) }
    const identity = { n, entries: zero.entries.map((_, k) => (k % (n + 1) === 0 ? 1 : 0)) }
    for (const [matrix, value] of [
      [zero, 0],
      [identity, 1],
    ] as const) {
      const spectrum = solver.solve(matrix.entries, n, n)
      expect([...spectrum.values]).toEqual(new Array(n).fill(value))
      expect(flaws(matrix, spectrum).overlap).toBeLessThan(1e-12)
    }
  })

  it('reads the lower triangle alone and leaves the matrix unchanged', () => {
    const { n, entries } = matrices['correlation 30 x 100']!()
    const lower = entries.map((x, k) => (k % n > Math.floor(k / n) ? Number.NaN : x))
    const before = lower.slice()
    expect(solver.solve(lower, n, 4)).toEqual(make().solve(entries, n, 4))
    expect(lower).toEqual(before)
  })

  it('gives the same whatever it solved before', () => {
    const used = make()
    for (const name of ['random 101', 'random 2', 'near-singular: Hilbert 12', 'random 60', 'random 7']) {
      const { n, entries } = matrices[name]!()
      expect(used.solve(entries, n, 3)).toEqual(make().solve(entries, n, 3))
    }
  })

  it('turns every vector so that its entry of largest magnitude is positive, the first of equal ones', () => {
    const { n, entries } = matrices['random 60']!()
    const { vectors, modes } = solver.solve(entries, n, n)
    for (let k = 0; k < modes; k++) {
      const row = vectors.subarray(k * n, (k + 1) * n)
      expect(Math.max(...row)).toBe(largest(row))
    }
    const antisymmetric = solver.solve(Float64Array.of(0, 0, -1, 0), 2, 1).vectors
    expect(antisymmetric[0]).toBeGreaterThan(0)
  })

  it.each([Number.NaN, Infinity, -Infinity])('fails with a fault, never with NaN, on an entry %d', (bad) => {
    for (const place of [0, 3, 8]) {
      const entries = Float64Array.of(1, 0, 0, 0.5, 1, 0, 0.2, 0.1, 1)
      entries[place] = bad
      const fault = catchFault(() => solver.solve(entries, 3, 1))
      expect(fault).toBe('not-finite')
    }
  })

  it('fails with a fault on eigenvalues beyond the range of numbers, and on too few entries', () => {
    const huge = new Float64Array(4).fill(1.7e308)
    expect(catchFault(() => solver.solve(huge, 2, 1))).toBe('too-large')
    expect(catchFault(() => solver.solve(huge, 3, 1))).toBe('bad-order')
    expect(catchFault(() => solver.solve(huge, 1.5, 1))).toBe('bad-order')
    expect(catchFault(() => solver.solve(huge, -1, 1))).toBe('bad-order')
  })

  it('solves matrices of the smallest numbers there are', () => {
    const { values } = solver.solve(Float64Array.of(1e-320, 0, 0, 2e-320), 2, 2)
    expect([...values]).toEqual([2e-320, 1e-320])
  })
})

function catchFault(solve: () => Spectrum): string | null {
  try {
    solve()
    return null
  } catch (error) {
    expect(error).toBeInstanceOf(SpectrumError)
    return (error as SpectrumError).fault
  }
}
