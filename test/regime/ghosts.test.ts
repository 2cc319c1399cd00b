import { describe, expect, it } from 'vitest'
import { BoxcarWindow } from '../../src/window/boxcar-window.ts'
import { ExponentialWindow } from '../../src/window/exponential-window.ts'
import { scene } from './setup.ts'
import { clip, model, withMarket } from './simulate.ts'

const span = 100
const n = 48
const at = 600

const settings = [
  { name: 'a reference of 300 frames', options: { reference: { frames: 300 } } },
  { name: 'a lagged reference', options: { reference: { lagged: span } } },
] as const

const crash = (x: Float64Array, size: number): void => {
  x.fill(size)
}

describe.each(settings)('with $name', ({ options }) => {
  const scenes = Array.from({ length: 6 }, (_, run) => {
    const s = scene({ ...options, keep: true }, 501 + run)
    const m = model(s.random, n, 0.25, 0.1)
    s.play(m, at)
    return { s, m, mark: s.mark() }
  })

  /** Shifts from frame `at` on, and frames whose evidence was beyond the limit, over a few runs. */
  function play(touch: (x: Float64Array, frame: number) => void) {
    let shifts = 0
    let beyond = 0
    for (const { s, m, mark } of scenes) {
      s.back(mark)
      s.play(m, 320, touch)
      shifts += s.bench.run.shifts.length
      beyond += s.bench.run.verdicts.filter((v) => (v.evidence?.ratio ?? 0) >= 1).length
    }
    return { shifts, beyond }
  }

  it.each([
    ['truncated at 5', 5],
    ['not truncated', 10],
  ] as const)(
    'one crash day of 10 deviations on all signals, %s, is not called, entering or leaving, though its evidence stands beyond the limit',
    (_, size) => {
      const { shifts, beyond } = play((x, frame) => {
        if (frame === at) crash(x, size)
      })
      expect(shifts).toBe(0)
      expect(beyond).toBeGreaterThan(100)
    },
  )

  it('a flash print of 40 deviations in one entry, left as it is, is not called', () => {
    expect(
      play((x, frame) => {
        if (frame === at) x[7] = 40
      }).shifts,
    ).toBe(0)
  })

  it('one signal that sticks is not called', () => {
    expect(
      play((x, frame) => {
        if (frame >= at) x[7] = 0
      }).shifts,
    ).toBe(0)
  })

  it('a burst of volatility whose common loudness was removed is not called', () => {
    expect(
      play((x, frame) => {
        if (frame < at || frame >= at + 40) return
        const loud = x.map((v) => 3 * v)
        // What the frames room does: divide by the loudness over the signals, then truncate.
        const loudness = [...loud].map(Math.abs).sort((a, b) => a - b)[n / 2]! * 1.4826
        for (let i = 0; i < n; i++) x[i] = clip(loud[i]! / loudness)
      }).shifts,
    ).toBe(0)
  })
})

it('a burst of volatility that was left in the frames is not called', () => {
  for (const window of [() => new BoxcarWindow(span), () => new ExponentialWindow(35)]) {
    for (let run = 0; run < 5; run++) {
      const s = scene({ window: window(), reference: { frames: 300 } }, 501 + run)
      s.play(model(s.random, n, 0.25, 0.1), 900, (x, frame) => {
        if (frame >= at && frame < at + 30) for (let i = 0; i < n; i++) x[i] = clip(3 * x[i]!)
      })
      expect(s.bench.run.shifts).toEqual([])
    }
  }
})

it('a crash day inside the reference is not called when the window is without it', () => {
  for (let run = 0; run < 5; run++) {
    const s = scene({}, 520 + run)
    s.play(model(s.random, n, 0.25, 0.1), 900, (x, frame) => {
      if (frame === 150) crash(x, 10)
    })
    expect(s.bench.run.shifts).toEqual([])
  }
})

it('a crash day does not hide the change of regime that follows it', () => {
  for (let run = 0; run < 3; run++) {
    const s = scene({}, 530 + run)
    const before = model(s.random, n, 0.25, 0.1)
    s.play(before, at)
    s.play(before, 1, (x) => crash(x, 10))
    s.play(withMarket(before, 0.25, 0.6), 120)
    expect(s.bench.run.shifts.map((shift) => shift.kind)).toEqual(['strength'])
    expect(s.bench.run.shifts[0]!.startTo).toBeGreaterThanOrEqual(1000 * (at - 20))
  }
})
