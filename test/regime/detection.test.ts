import { describe, expect, it } from 'vitest'
import { Random } from '../../src/regime/random.ts'
import type { Shift } from '../../src/regime/regime.ts'
import { median, scene } from './setup.ts'
import { type Model, model, rotated, timeOfFrame, withMarket } from './simulate.ts'

const span = 100
const n = 48

const quietScenes = Array.from({ length: 16 }, (_, run) => {
  const s = scene({}, 1000 + run)
  const random = new Random(70 + run)
  const before = model(random, n, 0.25, 0.1)
  s.play(before, 550)
  return { s, random, before, mark: s.mark(), quiet: s.bench.run.shifts.length === 0 }
})

/** First shift of each quiet run whose model changes at frame 550; false pages before are left out. */
function detect(
  change: (m: Model, random: Random) => Model,
  runs = quietScenes.length,
): { shift: Shift; delay: number }[] {
  const found: { shift: Shift; delay: number }[] = []
  for (const { s, random, before, mark, quiet } of quietScenes.slice(0, runs)) {
    if (!quiet) continue
    s.back(mark)
    const after = change(before, random)
    for (let t = 0; t < 300 && s.bench.run.shifts.length === 0; t++) s.play(after, 1)
    const shift = s.bench.run.shifts[0]
    if (shift !== undefined) found.push({ shift, delay: shift.frame - 550 })
  }
  return found
}

describe('changes of 48 signals, window 100, reference 300, one false page in 12,000 frames', () => {
  it('a market mode from .25 to .45 is called as strength', () => {
    const found = detect((m) => withMarket(m, 0.25, 0.45))
    expect(found.length).toBeGreaterThanOrEqual(14)
    expect(median(found.map((f) => f.delay))).toBeLessThanOrEqual(85)
    for (const { shift } of found) {
      expect(shift.kind).toBe('strength')
      expect(shift.shareAfter).toBeGreaterThan(shift.shareBefore)
      expect(shift.distance.w2).toBeLessThanOrEqual(shift.distance.ceiling + 1e-9)
      expect(shift.statistics.length).toBeGreaterThan(0)
    }
    const missed = found.map(({ shift }) => Math.abs(shift.start - timeOfFrame(550)) / 1000)
    expect(median(missed)).toBeLessThanOrEqual(30)
    const inside = found.filter(
      ({ shift }) => shift.startFrom <= timeOfFrame(550) && shift.startTo >= timeOfFrame(550),
    )
    expect(inside.length).toBeGreaterThanOrEqual(0.7 * found.length)
    console.log(`market .25 → .45: median delay ${median(found.map((f) => f.delay))} of ${found.length} runs`)
  })

  it('a market mode from .45 to .25 is called as strength, and its loss is carried by the old mode', () => {
    const found: Shift[] = []
    for (let run = 0; run < 4; run++) {
      const s = scene({}, 40 + run)
      const strong = model(s.random, n, 0.45, 0.1)
      s.play(strong, 450)
      s.play(withMarket(strong, 0.45, 0.25), 200)
      found.push(...s.bench.run.shifts.filter((shift) => shift.frame >= 450))
    }
    expect(found.length).toBeGreaterThanOrEqual(3)
    for (const shift of found) {
      expect(shift.kind).toBe('strength')
      expect(shift.shareAfter).toBeLessThan(shift.shareBefore)
    }
  })

  it('sectors whose members change are called as partners', () => {
    const found = detect(rotated)
    expect(found.length).toBeGreaterThanOrEqual(13)
    for (const { shift } of found) expect(shift.kind).toBe('partners')
    console.log(`rotation: median delay ${median(found.map((f) => f.delay))} of ${found.length} runs`)
  })

  it('a new factor on a quarter of the signals is called as partners, carried by these signals', () => {
    const found = detect((m) => {
      const fresh = Float64Array.from({ length: n }, (_, i) => (i < n / 4 ? Math.sqrt(0.3) : 0))
      return { ...m, loadings: [...m.loadings, fresh] }
    }, 8)
    expect(found.length).toBeGreaterThanOrEqual(7)
    for (const { shift } of found) {
      expect(shift.kind).toBe('partners')
      const own = shift.carriers.filter((c) => Number(c.signal.slice(1)) < n / 4)
      expect(own.reduce((sum, c) => sum + c.share, 0)).toBeGreaterThan(0.5)
    }
  })

  it('a signal that leaves all its partners is called as one signal, and is the first carrier', () => {
    const s = scene({}, 3)
    const strong = model(s.random, 30, 0.65, 0.05)
    s.play(strong, 450)
    // It mirrors the others: nothing but its own row and column changes.
    s.play(strong, 250, (x) => {
      x[4] = -x[4]!
    })
    const shift = s.bench.run.shifts[0]!
    expect(shift.frame).toBeGreaterThanOrEqual(450)
    expect(shift.kind).toBe('one-signal')
    expect(shift.carriers[0]!.signal).toBe('S4')
    expect(shift.carriers[0]!.share).toBeGreaterThan(0.3)
  })

  it('amplitudes that rise together are a shift in covariance scale only', () => {
    for (const [scale, expected] of [
      ['covariance', ['amplitude']],
      ['correlation', []],
    ] as const) {
      const s = scene({ scale }, 6)
      const m = model(s.random, 30, 0.25, 0.1)
      s.play(m, 450)
      s.play(m, 150, (x) => {
        for (let i = 0; i < x.length; i++) x[i]! *= 1.8
      })
      expect(s.bench.run.shifts.map((shift) => shift.kind)).toEqual(expected)
    }
  })

  it('a lagged reference sees a change of strength, and is steady again when the lag has passed it', () => {
    const s = scene({ reference: { lagged: span } }, 12)
    const before = model(s.random, n, 0.25, 0.1)
    s.play(before, 400)
    expect(s.bench.run.transitions[0]!.to).toBe('steady')
    s.play(withMarket(before, 0.25, 0.6), 700)
    expect(s.bench.run.shifts.map((shift) => shift.kind)).toEqual(['strength'])
    expect(s.bench.run.ended.map((e) => e.number)).toEqual([1])
  })

  it('shares of the carriers and the remainder add up to 1', () => {
    const found = [
      ...detect((m) => withMarket(m, 0.25, 0.6), 3),
      ...detect((_, random) => rotated(model(random, n, 0.25, 0.15), random), 3),
    ]
    expect(found.length).toBeGreaterThanOrEqual(5)
    for (const { shift } of found) {
      const sum = shift.carriers.reduce((total, c) => total + c.share, 0)
      expect(sum + shift.remainder).toBeCloseTo(1, 12)
      expect(shift.carriers.length).toBeLessThanOrEqual(10)
    }
  })
})
