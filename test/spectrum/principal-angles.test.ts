import { Matrix, SVD } from 'ml-matrix'
import { describe, expect, it } from 'vitest'
import { PlainSolver } from '../../src/spectrum/plain-solver.ts'
import { principalAngles, subspaceOverlap } from '../../src/spectrum/principal-angles.ts'
import { singularValues } from '../../src/spectrum/singular-values.ts'
import { Random } from '../support/random.ts'

const unit = (n: number, ...places: number[]): Float64Array => {
  const rows = new Float64Array(places.length * n)
  places.forEach((place, k) => {
    rows[k * n + place] = 1
  })
  return rows
}

/** Two rows that lean by the angles `a` and `b` out of the plane of the first two axes. */
const leaning = (a: number, b: number): Float64Array =>
  Float64Array.of(Math.cos(a), 0, Math.sin(a), 0, 0, Math.cos(b), 0, Math.sin(b))

describe('principal angles (Björck & Golub 1973)', () => {
  it.each([
    [0, 0],
    [1e-9, 0.3],
    [1e-12, Math.PI / 2 - 1e-9],
    [0.7, 1.2],
    [Math.PI / 2, Math.PI / 2],
  ])('are found to rounding, however small: %d and %d', (a, b) => {
    const angles = principalAngles(unit(4, 0, 1), leaning(a, b), 2, 4)
    expect(Math.abs(angles[0]! - a)).toBeLessThan(1e-15)
    expect(Math.abs(angles[1]! - b)).toBeLessThan(1e-15)
  })

  it('do not depend on the basis of a span', () => {
    const turned = Float64Array.of(0.6, 0.8, 0, 0, -0.8, 0.6, 0, 0)
    const angles = principalAngles(turned, leaning(0.2, 0.9), 2, 4)
    expect(angles[0]).toBeCloseTo(0.2, 14)
    expect(angles[1]).toBeCloseTo(0.9, 14)
  })

  it('the overlap is the mean squared cosine: 1 for the same span, 0 for orthogonal ones', () => {
    expect(subspaceOverlap(unit(5, 0, 1), unit(5, 1, 0), 2, 5)).toBe(1)
    expect(subspaceOverlap(unit(5, 0, 1), unit(5, 2, 3), 2, 5)).toBe(0)
    const expected = (Math.cos(0.7) ** 2 + Math.cos(1.2) ** 2) / 2
    expect(subspaceOverlap(unit(4, 0, 1), leaning(0.7, 1.2), 2, 4)).toBeCloseTo(expected, 14)
    expect(subspaceOverlap(unit(4), unit(4), 0, 4)).toBe(1)
  })

  it('singular values agree with ml-matrix', () => {
    const random = new Random(5)
    const entries = Float64Array.from({ length: 5 * 9 }, () => random.normal())
    const rows = Array.from({ length: 5 }, (_, r) => [...entries.subarray(r * 9, r * 9 + 9)])
    const expected = new SVD(new Matrix(rows)).diagonal
    singularValues(entries, 5, 9).forEach((value, k) => {
      expect(Math.abs(value - expected[k]!)).toBeLessThan(1e-13)
    })
  })

  it('the leading vectors of C and C + E differ by an angle of sine at most 2‖E‖/gap (Davis & Kahan 1970; Yu, Wang & Samworth 2015)', () => {
    const random = new Random(8)
    const solver = new PlainSolver()
    const n = 12
    let tightest = Infinity
    for (let run = 0; run < 60; run++) {
      const c = new Float64Array(n * n)
      const e = new Float64Array(n * n)
      for (let i = 0; i < n; i++) {
        for (let j = 0; j <= i; j++) {
          c[i * n + j] = c[j * n + i] = random.normal()
          e[i * n + j] = e[j * n + i] = 0.05 * random.normal()
        }
      }
      const before = solver.solve(c, n, 1)
      const after = solver.solve(
        c.map((x, k) => x + e[k]!),
        n,
        1,
      )
      const { values } = solver.solve(e, n, 0)
      const norm = Math.max(values[0]!, -values[n - 1]!)
      const bound = (2 * norm) / (before.values[0]! - before.values[1]!)
      const sine = Math.sin(principalAngles(before.vectors, after.vectors, 1, n)[0]!)
      expect(sine).toBeLessThanOrEqual(bound)
      tightest = Math.min(tightest, bound / sine)
    }
    expect(tightest).toBeLessThan(20)
  })
})
