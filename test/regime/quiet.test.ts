import { describe, expect, it } from 'vitest'
import { ExponentialWindow } from '../../src/window/exponential-window.ts'
import { scene } from './setup.ts'
import { model, type Tail } from './simulate.ts'

/** Frames watched and shifts called in quiet runs of 20 signals. */
function quiet(tail: Tail, runs: number, frames: number, budget: number, half: number | null = null) {
  let pages = 0
  let watched = 0
  for (let run = 0; run < runs; run++) {
    const s = scene(
      {
        tail,
        limits: { framesPerFalsePage: budget },
        reference: { frames: 300 },
        ...(half === null ? {} : { window: new ExponentialWindow(half) }),
      },
      1 + run,
    )
    const m = model(s.random, 20, 0.25, 0.1)
    s.play(m, frames)
    pages += s.bench.run.shifts.length
    watched += frames - 300 - s.bench.window.span - 300 * s.bench.run.shifts.length
  }
  return { pages, expected: watched / budget, watched }
}

describe('quiet runs under a budget', () => {
  it.each(['normal', 't4'] as const)(
    'page within a factor of 2 too often and 8 too seldom on %s data: 60 runs of 1,500 frames, 1 in 3,000',
    (tail) => {
      const { pages, expected, watched } = quiet(tail, 60, 1500, 3000)
      console.log(`${tail}: ${pages} false pages in ${watched} frames, budget ${expected.toFixed(1)}`)
      expect(pages).toBeLessThanOrEqual(2 * expected)
      expect(pages).toBeGreaterThanOrEqual(expected / 8)
    },
  )

  it('page seldom under an exponential memory too', () => {
    const { pages, expected } = quiet('normal', 12, 1200, 3000, 35)
    expect(pages).toBeLessThanOrEqual(2 * expected)
  })

  it('a budget ten times as strict pages less', () => {
    const loose = quiet('normal', 12, 1000, 300)
    const strict = quiet('normal', 12, 1000, 30_000)
    expect(loose.pages).toBeGreaterThan(strict.pages)
    expect(strict.pages).toBeLessThanOrEqual(2)
  })
})
