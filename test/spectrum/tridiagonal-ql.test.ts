import { expect, it } from 'vitest'
import { tridiagonalQl } from '../../src/spectrum/tridiagonal-ql.ts'
import { tridiagonalValues } from '../../src/spectrum/tridiagonal-values.ts'
import { Random } from '../support/random.ts'

it('QL with vectors has the values of the square-root-free QL, orthonormal vectors and small residuals', () => {
  const random = new Random(31)
  for (let run = 0; run < 300; run++) {
    const n = 1 + random.below(12)
    const entry = (): number => [0, 1, random.normal(), 10 ** (-20 * random.uniform())][random.below(4)]!
    const d = Float64Array.from({ length: n }, entry)
    const e = Float64Array.from({ length: n }, (_, i) => (i === 0 ? 0 : entry()))
    const values = d.slice()
    const rows = new Float64Array(n * n)
    expect(tridiagonalQl(values, e.slice(), n, rows)).toBe(true)
    const others = d.slice()
    expect(tridiagonalValues(others, e.slice(), n)).toBe(true)
    const sorted = values.slice().sort()
    others.sort()
    const norm = Math.max(1, ...values.map(Math.abs))
    for (let k = 0; k < n; k++) expect(Math.abs(sorted[k]! - others[k]!)).toBeLessThan(1e-13 * norm)
    for (let k = 0; k < n; k++) {
      for (let i = 0; i < n; i++) {
        const x = (j: number): number => (j < 0 || j >= n ? 0 : rows[k * n + j]!)
        const image = d[i]! * x(i) + (i > 0 ? e[i]! * x(i - 1) : 0) + (i < n - 1 ? e[i + 1]! * x(i + 1) : 0)
        expect(Math.abs(image - values[k]! * x(i))).toBeLessThan(1e-13 * norm)
      }
      for (let l = 0; l <= k; l++) {
        let inner = k === l ? -1 : 0
        for (let i = 0; i < n; i++) inner += rows[k * n + i]! * rows[l * n + i]!
        expect(Math.abs(inner)).toBeLessThan(1e-13)
      }
    }
  }
})
