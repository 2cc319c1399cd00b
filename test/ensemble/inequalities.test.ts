import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { composeEnsemble } from '../../src/compose.ts'
import type { Judged } from '../../src/ensemble.ts'
import { settingsSchema } from '../../src/settings/schema.ts'
import { PlainSolver } from '../../src/spectrum/plain-solver.ts'
import { wasserstein2 } from '../../src/spectrum/wasserstein.ts'
import { BoxcarWindow } from '../../src/window/boxcar-window.ts'
import { TwinWindow } from '../../src/window/twin-window.ts'
import { Random } from '../support/random.ts'

const rounding = 1e-12

/** Student's t with 2 degrees of freedom: no variance at all. */
const wild = (random: Random): number => random.normal() / Math.sqrt(random.exponential())

/** Frames of n signals with a common mode, all of it with wild tails. */
function* wildFrames(seed: number, n: number, mode: number): Generator<Float64Array> {
  const random = new Random(seed)
  for (;;) {
    const common = wild(random)
    yield Float64Array.from({ length: n }, () => mode * common + wild(random))
  }
}

const wildness = fc.record({
  seed: fc.nat(1_000_000),
  n: fc.integer({ min: 2, max: 14 }),
  mode: fc.double({ min: 0, max: 2, noNaN: true }),
  K: fc.double({ min: 1, max: 6, noNaN: true }),
})

describe('Hoffman and Wielandt (1953)', () => {
  test('the certificate bounds what truncation moved the spectrum by, on every frame', () => {
    const solver = new PlainSolver()
    fc.assert(
      fc.property(wildness, ({ seed, n, mode, K }) => {
        const window = new TwinWindow(() => new BoxcarWindow(25))
        const frames = wildFrames(seed, n, mode)
        const everywhere = new Uint8Array(n).fill(1)
        const truncated = new Float64Array(n * n)
        const untouched = new Float64Array(n * n)
        let clippedEver = 0
        for (let t = 0; t < 120; t++) {
          const scaled = frames.next().value as Float64Array
          const cleaned = scaled.map((x) => Math.max(-K, Math.min(K, x)))
          const clipped = scaled.reduce((count, x) => count + (Math.abs(x) > K ? 1 : 0), 0)
          clippedEver += clipped
          window.push(scaled, cleaned, everywhere, clipped)
          const active = window.cleaned.active()
          if (!window.cleaned.full || active.length < n) continue
          window.cleaned.correlation(truncated, active)
          window.scaled.correlation(untouched, active)
          const moved = wasserstein2(
            solver.solve(untouched, n, 0).values.slice(),
            solver.solve(truncated, n, 0).values.slice(),
          )
          const certificate = window.certificate(truncated, active)
          expect(moved).toBeLessThanOrEqual(certificate + rounding)
          if (!window.twinned) expect(certificate).toBe(0)
        }
        if (K < 2) expect(clippedEver).toBeGreaterThan(0)
      }),
      { numRuns: 40 },
    )
  })

  test('W2 keeps under its ceiling on every frame that an ensemble judges, whatever its settings', () => {
    const choices = fc.record({
      seed: fc.nat(1_000_000),
      n: fc.integer({ min: 3, max: 10 }),
      window: fc.constantFrom('{ "frames": 20 }', '{ "half-life": 8 }'),
      reference: fc.constantFrom('{ "frames": 30 }', '{ "lagged": 20 }'),
      volatility: fc.constantFrom('remove', 'keep'),
      truncate: fc.constantFrom('"off"', '{ "at": 2 }', '{ "at": 5 }'),
      scale: fc.constantFrom('correlation', 'covariance'),
      missing: fc.double({ min: 0, max: 0.15, noNaN: true }),
    })
    let distances = 0
    let certified = 0
    fc.assert(
      fc.property(choices, (choice) => {
        for (const judged of judgedFrames(choice)) {
          const { distance } = judged.verdict
          if (judged.certificate !== null) {
            expect(judged.certificate).toBeGreaterThanOrEqual(0)
            if (judged.certificate > 0) certified++
          }
          if (distance === null) continue
          distances++
          expect(distance.w2).toBeLessThanOrEqual(distance.ceiling + rounding)
          expect(distance.rotation).toBeGreaterThanOrEqual(0)
          expect(distance.rotation).toBeLessThanOrEqual(1)
        }
      }),
      { numRuns: 60 },
    )
    expect(distances).toBeGreaterThan(1000)
    expect(certified).toBeGreaterThan(100)
  })
})

interface Choice {
  readonly seed: number
  readonly n: number
  readonly window: string
  readonly reference: string
  readonly volatility: string
  readonly truncate: string
  readonly scale: string
  readonly missing: number
}

function judgedFrames(choice: Choice): Judged[] {
  const { seed, n } = choice
  const names = Array.from({ length: n }, (_, i) => `S${i}`)
  const settings = settingsSchema.parse({
    ensembles: {
      wild: {
        signals: names,
        clock: { step: '1s' },
        increment: 'difference',
        window: JSON.parse(choice.window),
        reference: JSON.parse(choice.reference),
        'common-volatility': choice.volatility,
        truncate: JSON.parse(choice.truncate),
        scale: choice.scale,
      },
    },
  })
  const composed = composeEnsemble('wild', settings.ensembles.wild!)
  if (!composed.ok) throw composed.error
  const ensemble = composed.value
  const random = new Random(seed)
  const frames = wildFrames(seed, n, 0.7)
  const level = new Float64Array(n)
  const judged: Judged[] = []
  for (let t = 0; t < 160; t++) {
    const step = frames.next().value as Float64Array
    const here = names.map((_, i) => i).filter(() => random.uniform() >= choice.missing)
    for (const i of here) level[i] = level[i]! + step[i]!
    const batch = {
      count: here.length,
      names,
      signal: Int32Array.from(here),
      time: new Float64Array(here.length).fill(t * 1000 + 1),
      value: Float64Array.from(here, (i) => level[i]!),
      dropped: {},
    }
    const { frames: closed } = ensemble.take(
      'feed',
      { type: 'batch', source: 'one', batch, quarantined: [], position: {}, behind: null, done() {} },
      Date.UTC(2026, 0),
    )
    for (const frame of closed) judged.push(ensemble.judge(frame, () => 0))
  }
  return judged
}
