import fc from 'fast-check'
import { EigenvalueDecomposition, Matrix } from 'ml-matrix'
import { describe, expect, it } from 'vitest'
import { drawWith, drawWithout } from '../../src/regime/block-draws.ts'
import { changePoint, newestHalf } from '../../src/regime/change-modes.ts'
import { weigh } from '../../src/regime/evidence.ts'
import { LimitDraws } from '../../src/regime/limit-draws.ts'
import { measure } from '../../src/regime/measures.ts'
import { Random } from '../../src/regime/random.ts'
import { referenceFrom, solvedBase, standardised } from '../../src/regime/reference.ts'
import { likenesses, remember } from '../../src/regime/remembered.ts'
import { bounded, energiesOf, matrixOf, type Rows, range } from '../../src/regime/rows.ts'
import { exponentialTail, normalTail, upperNormal, windowTail } from '../../src/regime/tail.ts'
import { readExplicitLimits } from '../../src/regime/watch-options.ts'
import { FrameRing } from '../../src/window/frame-ring.ts'
import { solver } from './setup.ts'
import { frameOf, model } from './simulate.ts'

const equal = (n: number, r: number): Float64Array =>
  Float64Array.from({ length: n * n }, (_, k) => (Math.floor(k / n) === k % n ? 1 : r))

function ringOf(count: number, n: number, seed: number): FrameRing {
  const random = new Random(seed)
  const m = model(new Random(5), n, 0.25, 0.1)
  const ring = new FrameRing(count)
  for (let t = 0; t < count; t++) ring.push(frameOf(m, random, 'normal'), new Uint8Array(n).fill(1))
  return ring
}

describe('the normal tail', () => {
  it.each([
    // P(Z > z), tables of the normal law (Abramowitz & Stegun 1964, table 26.1; from memory).
    [1, 0.158655253931],
    [1.959963984540054, 0.025],
    [2, 0.022750131948],
    [3, 0.001349898032],
    [5, 2.866515719e-7],
    [6, 9.86587645e-10],
  ])('is right at %d', (z, p) => {
    expect(normalTail(z) / p).toBeCloseTo(1, 8)
    expect(upperNormal(p)).toBeCloseTo(z, 8)
  })

  it('and its quantile undo each other down to 1e-200', () => {
    for (const p of [0.4, 0.1, 1e-3, 1e-8, 1e-20, 1e-100, 1e-200]) {
      expect(normalTail(upperNormal(p)) / p).toBeCloseTo(1, 8)
    }
  })
})

describe('the budget', () => {
  it('makes a window rarer the more frames a false page may take, and the shorter the window', () => {
    const p = windowTail(12_000, 1 / 100, 2)
    expect(windowTail(120_000, 1 / 100, 2)).toBeLessThan(p / 9)
    expect(windowTail(12_000, 1 / 50, 2)).toBeLessThan(p)
    const z = upperNormal(p)
    expect(12_000 * (1 / 100) * 2 * z * z * p).toBeCloseTo(1, 6)
  })

  it('counts the clumps of a boxcar mean of normal frames: simulated crossings agree within a third', () => {
    const random = new Random(17)
    const span = 50
    const frames = 400_000
    const p = windowTail(4000, 1 / span, 1)
    const z = upperNormal(p)
    const past = Array.from({ length: span }, () => random.normal())
    let sum = past.reduce((a, b) => a + b, 0)
    let clumps = 0
    let quietUntil = 0
    for (let t = 0; t < frames; t++) {
      const fresh = random.normal()
      sum += fresh - past[t % span]!
      past[t % span] = fresh
      if (sum / Math.sqrt(span) <= z) continue
      if (t >= quietUntil) clumps++
      quietUntil = t + span
    }
    expect(clumps / (frames / 4000)).toBeGreaterThan(0.67)
    expect(clumps / (frames / 4000)).toBeLessThan(1.33)
  })

  it('the exponential tail of a squared normal is near its true quantile a hundredfold beyond the draws', () => {
    const random = new Random(4)
    const draws = Float64Array.from({ length: 400 }, () => random.normal() ** 2)
    // P(Z² > x) = 1e-4 at x = 15.137 (chi-square, one degree of freedom: upperNormal(5e-5)²).
    expect(exponentialTail(draws, 1e-4) / 15.137).toBeGreaterThan(0.8)
    expect(exponentialTail(draws, 1e-4) / 15.137).toBeLessThan(1.35)
    expect(exponentialTail(draws, 0.5)).toBe(Math.max(...draws))
  })
})

describe('draws', () => {
  it('without replacement take no row twice; both take whole blocks around the circle', () => {
    fc.assert(
      fc.property(
        fc.integer({ min: 4, max: 60 }),
        fc.integer({ min: 1, max: 9 }),
        fc.integer({ min: 1, max: 1e6 }),
        (frames, block, seed) => {
          const wanted = Math.max(1, Math.floor(frames / 2))
          const once = drawWithout(new Random(seed), frames, wanted, block)
          expect(once).toHaveLength(wanted)
          expect(new Set(once).size).toBe(wanted)
          expect(drawWithout(new Random(seed), frames, frames, block)).toHaveLength(frames)
          const again = drawWith(new Random(seed), frames, 2 * frames, block)
          expect(again).toHaveLength(2 * frames)
          for (let k = 0; k + 1 < again.length; k++) {
            if (k % block !== block - 1) expect(again[k + 1]).toBe((again[k]! + 1) % frames)
          }
          expect([...once, ...again].every((row) => row >= 0 && row < frames)).toBe(true)
        },
      ),
      { seed: 41, numRuns: 200 },
    )
  })

  it('tell how far a new window will lie from the reference: mean squares agree within 12 %', () => {
    const n = 20
    const span = 60
    const frames = 180
    const told = { whole: 0, partners: 0, spectra: 0 }
    const seen = { whole: 0, partners: 0, spectra: 0 }
    const runs = 120
    for (let run = 0; run < runs; run++) {
      const ring = ringOf(frames + 400, n, 100 + run)
      const made = referenceFrom(ring, frames, 400, solver, 'correlation')!
      const draws = new LimitDraws(
        { kind: 'fixed', span },
        made.rows,
        made.reference,
        'correlation',
        solver,
        100,
        run,
      )
      draws.step(1000)
      const { distances } = draws.calibration(0.001)
      told.whole += distances.frobenius.meanSquare / runs
      told.partners += distances['partner-distance'].meanSquare / runs
      told.spectra += distances['spectral-distance'].meanSquare / runs
      for (const skip of [0, 100, 200, 300]) {
        const { indices, means, scales } = made.reference
        const rows = standardised(ring, span, skip, indices, means, scales)
        const matrix = matrixOf(rows, range(span), 'correlation')
        const m = measure(matrix, solver.solve(matrix, n, 0).values, made.reference)
        seen.whole += m.ceiling ** 2 / (4 * runs)
        seen.partners += m.partners ** 2 / (4 * runs)
        seen.spectra += m.w2 ** 2 / (4 * runs)
      }
    }
    for (const name of ['whole', 'partners', 'spectra'] as const) {
      expect(told[name] / seen[name]).toBeGreaterThan(0.88)
      expect(told[name] / seen[name]).toBeLessThan(1.12)
    }
  })
})

describe('measures', () => {
  it('equal correlation .2 → .5 of 30 signals: W2 = ceiling = .3·√29, λ1 6.8 → 15.5 (check values)', () => {
    const n = 30
    const base = solvedBase(equal(n, 0.2), n, solver)
    const now = equal(n, 0.5)
    const m = measure(now, solver.solve(now, n, 0).values, base)
    expect(m.w2).toBeCloseTo(1.6155494, 7)
    expect(m.ceiling).toBeCloseTo(1.6155494, 7)
    expect(m.shareBefore * n).toBeCloseTo(6.8, 10)
    expect(m.share * n).toBeCloseTo(15.5, 10)
    // Off the leading mode C − C0 is −.3 times the identity of 29 dimensions.
    expect(m.partners).toBeCloseTo(0.3 * Math.sqrt(29 / 30), 10)
  })

  it('W2 ≤ ceiling, partners ≤ ceiling, and the projection is what ml-matrix makes of it', () => {
    fc.assert(
      fc.property(fc.integer({ min: 2, max: 9 }), fc.integer({ min: 1, max: 1e6 }), (n, seed) => {
        const random = new Random(seed)
        const rows = (count: number): Rows => ({
          n,
          count,
          values: Float64Array.from({ length: n * count }, () => random.normal()),
          present: new Uint8Array(n * count).fill(1),
        })
        const base = solvedBase(matrixOf(rows(12), range(12), 'correlation'), n, solver)
        const now = matrixOf(rows(9), range(9), 'correlation')
        const m = measure(now, solver.solve(now, n, 0).values, base)
        expect(m.w2).toBeLessThanOrEqual(m.ceiling + 1e-9)
        expect(m.partners).toBeLessThanOrEqual(m.ceiling + 1e-9)
        const toMatrix = (a: Float64Array) =>
          new Matrix(Array.from({ length: n }, (_, i) => [...a.subarray(i * n, (i + 1) * n)]))
        const c0 = toMatrix(base.matrix)
        const solved = new EigenvalueDecomposition(c0, { assumeSymmetric: true })
        const top = solved.realEigenvalues.indexOf(Math.max(...solved.realEigenvalues))
        const v = solved.eigenvectorMatrix.getColumnVector(top)
        const p = Matrix.eye(n).sub(v.mmul(v.transpose()))
        const projected = p.mmul(toMatrix(now).sub(c0)).mmul(p)
        expect(m.partners).toBeCloseTo(projected.norm('frobenius') / Math.sqrt(n), 6)
      }),
      { seed: 42, numRuns: 100 },
    )
  })
})

describe('evidence', () => {
  const m = { n: 10, share: 0.5, shareBefore: 0.3, w2: 0.6, ceiling: 0.9, partners: 0.4 }
  const learnt = {
    n: 10,
    share: { centre: 1, reach: 0.1 },
    distances: {
      'spectral-distance': { rest: 0.2, limit: 0.6, meanSquare: 0.05 },
      frobenius: { rest: 0.5, limit: 1.3, meanSquare: 0.3 },
      'partner-distance': { rest: 0.4, limit: 0.5, meanSquare: 0.16 },
    },
  }

  it('is 1 at the limit and 0 at rest', () => {
    const ratios = Object.fromEntries(weigh(m, learnt, null).map((r) => [r.statistic, r.ratio]))
    expect(ratios['spectral-distance']).toBeCloseTo(1, 12)
    expect(ratios.frobenius).toBeCloseTo(0.5, 12)
    expect(ratios['partner-distance']).toBeCloseTo(0, 12)
    expect(ratios['leading-share']).toBeCloseTo((Math.cbrt(5 / 3) - 1) / 0.1, 12)
  })

  it('the share is beyond its limit exactly when its change is, on either side', () => {
    for (const share of [0.1, 0.2, 0.2186, 0.22, 0.3, 0.39, 0.4, 0.5]) {
      const r = weigh({ ...m, share }, learnt, null)[0]!
      expect(r.ratio >= 1).toBe(r.value >= r.limit)
      expect(r.value).toBeCloseTo(Math.abs(share - 0.3), 12)
    }
  })

  it('explicit limits of zero or names that do not exist give no NaN and a coded error', () => {
    const readings = weigh(m, null, { frobenius: 0 })
    expect(readings).toEqual([{ statistic: 'frobenius', value: 0.9, limit: 0, ratio: 1e6 }])
    const read = readExplicitLimits({ frobenius: 1, colour: 2 })
    expect(!read.ok && read.error.code).toBe('limit-unknown')
    expect(readExplicitLimits({ frobenius: 1 }).ok).toBe(true)
  })
})

describe('frames bounded in loudness', () => {
  it('leave quiet rows as they are and bring a crash down to the median', () => {
    const n = 12
    const ring = ringOf(80, n, 3)
    const made = referenceFrom(ring, 80, 0, solver, 'correlation')!
    const values = made.rows.values.slice()
    values.fill(10, 40 * n, 41 * n)
    const out = bounded({ ...made.rows, values }, made.reference.spread)
    const energies = energiesOf(out)
    const before = energiesOf(made.rows)
    const median = [...energiesOf({ ...made.rows, values })].sort((a, b) => a - b)[40]!
    expect(energies[40]).toBeCloseTo(median, 9)
    const kept = [...energies.keys()].filter((row) => energies[row] === before[row])
    expect(kept.length).toBeGreaterThanOrEqual(77)
  })
})

describe('the start of a change', () => {
  const n = 6
  const along = (count: number, size: (row: number) => number, seed: number): Rows => {
    const random = new Random(seed)
    const values = Float64Array.from({ length: n * count }, (_, k) =>
      k % n === 2 ? size(Math.floor(k / n)) * random.normal() : random.normal(),
    )
    return { n, count, values, present: new Uint8Array(n * count).fill(1) }
  }
  const mode = (weight: number) => [{ weight, vector: Float64Array.of(0, 0, 1, 0, 0, 0), before: 1 }]

  it('is found with its interval, for variance gained and variance lost', () => {
    for (const [size, weight] of [
      [3, 8],
      [0.2, -0.96],
    ] as const) {
      let off = 0
      let inside = 0
      for (let seed = 1; seed <= 40; seed++) {
        const rows = along(150, (row) => (row >= 100 ? size : 1), seed)
        const point = changePoint(rows, mode(weight), 4)
        off += Math.abs(point.at - 100) / 40
        if (point.from <= 100 && point.to >= 100) inside++
        expect(point.from).toBeLessThanOrEqual(point.at)
        expect(point.to).toBeGreaterThanOrEqual(point.at)
      }
      expect(off).toBeLessThan(8)
      expect(inside).toBeGreaterThanOrEqual(36)
    }
  })

  it('the newest half carries a fresh change and not one that is on its way out', () => {
    expect(
      newestHalf(
        along(100, (row) => (row >= 60 ? 4 : 1), 1),
        mode(3),
      ),
    ).toBeGreaterThan(1.5)
    expect(
      newestHalf(
        along(100, (row) => (row < 40 ? 4 : 1), 1),
        mode(3),
      ),
    ).toBeLessThan(0.4)
    expect(
      newestHalf(
        along(100, () => 3, 1),
        mode(3),
      ),
    ).toBeGreaterThan(0.6)
  })
})

describe('remembered regimes', () => {
  it('are at most twenty, the oldest give way, and a regime learnt anew replaces itself', () => {
    let list = remember([], 0, Int32Array.of(0, 1), equal(2, 0.1))
    for (let k = 1; k < 30; k++) list = remember(list, k, Int32Array.of(0, 1), equal(2, k / 40))
    expect(list.map((r) => r.regime)).toEqual(Array.from({ length: 20 }, (_, k) => k + 10))
    list = remember(list, 29, Int32Array.of(0, 1), equal(2, 0.9))
    expect(list).toHaveLength(20)
  })

  it('likeness is 1 to the same matrix, less to others, and taken on the signals in common', () => {
    const signals = Int32Array.of(1, 3, 4)
    const list = [
      ...remember([], 0, signals, equal(3, 0.8)),
      ...remember([], 1, Int32Array.of(3, 4, 9), equal(3, -0.4)),
      ...remember([], 2, Int32Array.of(7, 8), equal(2, 0.5)),
    ]
    const found = likenesses(list, signals, equal(3, 0.8))
    expect(found.map((l) => l.regime)).toEqual([0, 1, 2])
    expect(found[0]!.likeness).toBeCloseTo(1, 6)
    // Two signals in common: (1 + 1 − 2·.8·.4)/√((2 + 2·.64)(2 + 2·.16)).
    expect(found[1]!.likeness).toBeCloseTo(1.36 / Math.sqrt(3.28 * 2.32), 6)
    expect(found[2]!.likeness).toBe(0)
  })
})
