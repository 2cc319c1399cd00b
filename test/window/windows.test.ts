import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { BoxcarWindow } from '../../src/window/boxcar-window.ts'
import { decayOf, ExponentialWindow } from '../../src/window/exponential-window.ts'
import { LaggedWindow } from '../../src/window/lagged-window.ts'
import type { Window } from '../../src/window/window.ts'
import { batchCorrelation, largestDifference, normals, presentOf, type Row, valuesOf } from './batch.ts'

const entry = fc.oneof(
  { weight: 8, arbitrary: fc.integer({ min: -40, max: 40 }).map((v) => v / 8) },
  { weight: 1, arbitrary: fc.constant(null) },
)
const rowsOf = (n: number, least: number, most: number): fc.Arbitrary<Row[]> =>
  fc.array(fc.array(entry, { minLength: n, maxLength: n }), { minLength: least, maxLength: most })

function matrixOf(window: Window, active: Int32Array): Float64Array {
  const out = new Float64Array(active.length ** 2)
  window.correlation(out, active)
  return out
}

const push = (window: Window, row: Row): void => window.push(valuesOf(row), presentOf(row))

const pick = (matrix: Float64Array, n: number, active: Int32Array): Float64Array =>
  Float64Array.from({ length: active.length ** 2 }, (_, k) => {
    const i = active[Math.floor(k / active.length)]!
    return matrix[i * n + active[k % active.length]!]!
  })

describe('a boxcar window', () => {
  it('equals the batch formula over its last T frames at every step', () => {
    fc.assert(
      fc.property(rowsOf(4, 5, 40), fc.integer({ min: 3, max: 12 }), (rows, span) => {
        const window = new BoxcarWindow(span, 7)
        rows.forEach((row, t) => {
          push(window, row)
          const held = rows.slice(Math.max(0, t + 1 - span), t + 1)
          expect(window.frames).toBe(held.length)
          const active = window.active()
          const batch = batchCorrelation(
            held,
            held.map(() => 1),
            4,
          )
          expect(largestDifference(matrixOf(window, active), pick(batch, 4, active))).toBeLessThan(1e-9)
        })
      }),
      { seed: 21, numRuns: 80 },
    )
  })

  it('keeps plain Pearson to 1e-12 over 8,000 pushes when means are a million deviations', () => {
    const normal = normals(5)
    const n = 7
    const span = 100
    const window = new BoxcarWindow(span)
    const rows: number[][] = []
    for (let t = 0; t < 8000; t++) {
      const common = normal()
      const row = Array.from({ length: n }, (_, i) => 10 ** i + 0.6 * common + normal())
      rows.push(row)
      push(window, row)
      if (t % 97 !== 0 || t < span) continue
      const held = rows.slice(t + 1 - span)
      const means = Array.from(
        { length: n },
        (_, i) => held.reduce((s, r) => s + (r[i]! - 10 ** i), 0) / span,
      )
      const centred = held.map((r) => r.map((v, i) => v - 10 ** i - means[i]!))
      const batch = batchCorrelation(
        centred,
        held.map(() => 1),
        n,
      )
      const difference = largestDifference(matrixOf(window, window.active()), batch)
      expect(difference).toBeLessThan(1e-12)
    }
    expect(window.drift).toBeLessThan(1e-12)
  })

  it('stays within 1e-11 over 200,000 frames, and the scheduled rebuild measures the drift', () => {
    const normal = normals(6)
    const n = 5
    const window = new BoxcarWindow(64, 50_000)
    const x = new Float64Array(n)
    const present = new Uint8Array(n).fill(1)
    const drifts: number[] = []
    for (let t = 1; t <= 200_000; t++) {
      const common = normal()
      for (let i = 0; i < n; i++) x[i] = common + normal()
      window.push(x, present)
      if (t % 50_000 === 0) drifts.push(window.drift!)
    }
    expect(drifts).toHaveLength(4)
    expect(new Set(drifts).size).toBe(4)
    expect(Math.max(...drifts)).toBeLessThan(1e-11)
    expect(Math.min(...drifts)).toBeGreaterThan(0)
  })

  it('forgets a spike of a billion deviations as soon as it has left', () => {
    const normal = normals(7)
    const span = 50
    const window = new BoxcarWindow(span, 1_000_000)
    const rows: number[][] = []
    for (let t = 0; t < 200; t++) {
      const common = normal()
      const row = [common + normal(), common + normal(), common + normal()]
      if (t === 100) row[1] = 1e9
      rows.push(row)
      push(window, row)
    }
    const held = rows.slice(-span)
    const batch = batchCorrelation(
      held,
      held.map(() => 1),
      3,
    )
    expect(largestDifference(matrixOf(window, window.active()), batch)).toBeLessThan(1e-12)
  })

  it('names signals missing in more than a fifth of it, or constant, and leaves them out', () => {
    const window = new BoxcarWindow(10)
    for (let t = 0; t < 10; t++) push(window, [Math.sin(t), t < 3 ? null : Math.cos(t), t < 2 ? null : t, 4])
    expect([...window.active()]).toEqual([0, 2])
    expect(window.absent()).toEqual([
      { index: 1, why: 'missing', present: 0.7 },
      { index: 3, why: 'constant', present: 1 },
    ])
  })

  it('a signal that stands still after having moved is constant once its movement has left', () => {
    const normal = normals(9)
    const window = new BoxcarWindow(20)
    push(window, [0, 0])
    for (let t = 0; t < 60; t++) push(window, [normal(), t < 30 ? normal() : 0])
    expect([...window.active()]).toEqual([0])
  })

  it('does not restart when the roster grows or a transmitter dies', () => {
    const normal = normals(8)
    const span = 20
    const window = new BoxcarWindow(span)
    const rows: Row[] = []
    for (let t = 0; t < 90; t++) {
      const row: (number | null)[] = [normal(), normal(), t > 45 ? null : normal()]
      if (t >= 30) row.push(normal(), normal())
      rows.push(row)
      push(window, row)
      if (t === 29) expect([...window.active()]).toEqual([0, 1, 2])
      if (t === 32) expect([...window.active()]).toEqual([0, 1, 2])
      if (t === 49) expect([...window.active()]).toEqual([0, 1, 2, 3, 4])
      if (t === 50) expect([...window.active()]).toEqual([0, 1, 3, 4])
      expect(window.frames).toBe(Math.min(span, t + 1))
    }
    expect(window.absent()).toEqual([{ index: 2, why: 'missing', present: 0 }])
    const active = window.active()
    const held = rows.slice(-span)
    const batch = pick(
      batchCorrelation(
        held,
        held.map(() => 1),
        5,
      ),
      5,
      active,
    )
    expect(largestDifference(matrixOf(window, active), batch)).toBeLessThan(1e-12)
  })
})

describe('an exponential window', () => {
  it('equals the weighted batch formula, normalised while it fills', () => {
    fc.assert(
      fc.property(rowsOf(3, 5, 40), fc.integer({ min: 4, max: 20 }), (rows, halfLife) => {
        const window = new ExponentialWindow(halfLife, 6)
        const a = decayOf(halfLife)
        rows.forEach((row, t) => {
          push(window, row)
          const active = window.active()
          const weights = rows.slice(0, t + 1).map((_, s) => a ** (t - s))
          const batch = batchCorrelation(rows.slice(0, t + 1), weights, 3)
          expect(largestDifference(matrixOf(window, active), pick(batch, 3, active))).toBeLessThan(1e-9)
        })
      }),
      { seed: 22, numRuns: 60 },
    )
  })

  it('halves a weight in one half-life, and counts effective frames as Kish does', () => {
    expect(decayOf(100) ** 100).toBeCloseTo(0.5, 14)
    const window = new ExponentialWindow(10)
    const a = window.decay
    for (let t = 1; t <= 300; t++) {
      push(window, [t % 7, t % 5])
      const weights = Array.from({ length: t }, (_, k) => a ** k)
      const sum = weights.reduce((s, w) => s + w, 0)
      const squares = weights.reduce((s, w) => s + w * w, 0)
      expect(window.effective).toBeCloseTo((sum * sum) / squares, 9)
      expect(window.full).toBe(1 - a ** t >= 0.95)
    }
    expect(window.effective).toBeCloseTo((1 + a) / (1 - a), 6)
  })

  it('stays finite and exact when a signal is long dead and another moves far away', () => {
    const normal = normals(10)
    const window = new ExponentialWindow(8)
    const rows: Row[] = []
    for (let t = 0; t < 9000; t++) {
      const row = [t < 20 ? normal() : null, 1e4 * Math.floor(t / 1500) + normal(), normal()]
      rows.push(row)
      push(window, row)
    }
    expect([...window.active()]).toEqual([1, 2])
    const held = rows.slice(-420)
    const weights = held.map((_, s) => window.decay ** (held.length - 1 - s))
    const batch = pick(batchCorrelation(held, weights, 3), 3, Int32Array.of(1, 2))
    expect(largestDifference(matrixOf(window, Int32Array.of(1, 2)), batch)).toBeLessThan(1e-9)
  })
})

describe('a lagged window', () => {
  it('is the window that ended L frames ago', () => {
    const normal = normals(3)
    const make = [(): Window => new BoxcarWindow(12, 9), (): Window => new ExponentialWindow(6)]
    for (const inner of make) {
      const lagged = new LaggedWindow(inner(), 7)
      const past: Float64Array[] = []
      const now = inner()
      const active = Int32Array.of(0, 1, 2)
      for (let t = 0; t < 60; t++) {
        const row = [normal(), normal(), t % 11 === 0 ? null : normal()]
        push(now, row)
        push(lagged, row)
        past.push(matrixOf(now, active))
        if (t >= 12) expect(matrixOf(lagged, active)).toEqual(past[t - 7])
        expect(lagged.full).toBe(t + 1 >= lagged.span)
      }
    }
  })
})

describe.each([
  ['boxcar', (): Window => new BoxcarWindow(9, 5)],
  ['exponential', (): Window => new ExponentialWindow(5, 4)],
  ['lagged', (): Window => new LaggedWindow(new BoxcarWindow(6, 5), 4)],
] as const)('the snapshot of a %s window', (_, make) => {
  it('goes on bit for bit', () => {
    fc.assert(
      fc.property(rowsOf(3, 1, 30), rowsOf(5, 1, 30), (before, after) => {
        const a = make()
        for (const row of before) push(a, row)
        const b = make()
        b.restore(structuredClone(a.snapshot()))
        for (const row of after) {
          push(a, row)
          push(b, row)
          const active = a.active()
          expect(b.active()).toEqual(active)
          expect(matrixOf(b, active)).toEqual(matrixOf(a, active))
          expect([b.frames, b.effective, b.drift]).toEqual([a.frames, a.effective, a.drift])
        }
      }),
      { seed: 23, numRuns: 60 },
    )
  })
})
