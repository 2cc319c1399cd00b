import { describe, expect, test } from 'vitest'
import { EppsCheck } from '../../src/frames/epps.ts'
import { FrameMaker, type Made } from '../../src/frames/frame-maker.ts'
import { Random } from '../support/random.ts'
import { Feeder, plainOptions, present, type Reading } from './feed.ts'

const rho = 0.6

/**
 * Two random walks of correlation ρ, each seen at the instants of its own Poisson process of rate 1 a second.
 * Readings of `seconds` seconds through a frame maker with steps of `step` seconds.
 */
function previousTicks(step: number, seconds: number, seed: number): { maker: FrameMaker; made: Made } {
  const random = new Random(seed)
  const names = ['a', 'b']
  const next = [0, 0]
  const level = [0, 0]
  const signal: number[] = []
  const time: number[] = []
  const value: number[] = []
  const wait = (): number => -Math.log(1 - random.uniform())
  next[0] = wait()
  next[1] = wait()
  for (let now = 0; now < seconds; ) {
    const who = next[0]! < next[1]! ? 0 : 1
    const root = Math.sqrt(next[who]! - now)
    const first = random.normal()
    const second = rho * first + Math.sqrt(1 - rho * rho) * random.normal()
    level[0] = level[0]! + root * first
    level[1] = level[1]! + root * second
    now = next[who]!
    signal.push(who)
    time.push(1e12 + 1000 * now)
    value.push(level[who]!)
    next[who] = now + wait()
  }
  const maker = new FrameMaker({
    ...plainOptions,
    signals: { names },
    step: 1000 * step,
    lateness: 0,
    staleAfter: 3_600_000,
  })
  const made = maker.take(
    'ticks',
    {
      count: signal.length,
      names,
      signal: Int32Array.from(signal),
      time: Float64Array.from(time),
      value: Float64Array.from(value),
    },
    present,
  )
  return { maker, made }
}

function correlationOf({ frames }: Made): number {
  let ab = 0
  let aa = 0
  let bb = 0
  for (const { increments } of frames) {
    const a = increments[0]!
    const b = increments[1]!
    ab += a * b
    aa += a * a
    bb += b * b
  }
  return ab / Math.sqrt(aa * bb)
}

describe('the Epps effect', () => {
  test.each([
    [1, 0.22073, 200_000],
    [5, 0.4808, 400_000],
  ])(
    'previous ticks of Poisson updates, λ = 1: at step %d s the correlation .6 becomes %d (check-values; Epps 1979)',
    (step, expected, seconds) => {
      expect(rho * (1 - (1 - Math.exp(-step)) / step)).toBeCloseTo(expected, 4)
      // Standard error about 1/√frames: 0.0022 and 0.0035.
      expect(Math.abs(correlationOf(previousTicks(step, seconds, 41).made) - expected)).toBeLessThan(0.012)
    },
  )

  test('of readings whose step is short for them a warning comes, and none where it is long', () => {
    // ρ(1 − (1 − e^−h)/h) at h and 6h: .2207 and .5003, a ratio of .44; .5700 and .5950, .96. Warned below .7.
    // The running means reach back some 800 steps and 130 longer ones: standard errors of about .035 and .07.
    const short = previousTicks(1, 20_000, 45).maker
    expect(Math.abs(short.stepComparison!.step - 0.2207)).toBeLessThan(0.12)
    expect(Math.abs(short.stepComparison!.longer - 0.5003)).toBeLessThan(0.25)
    expect(short.stepWarning).toMatch(/6 steps \(Epps effect\)/)
    const long = previousTicks(20, 60_000, 45).maker
    expect(Math.abs(long.stepComparison!.step - 0.57)).toBeLessThan(0.12)
    expect(long.stepWarning).toBeNull()
  })

  test('no sum of a longer step is taken over a step that made no frame', () => {
    // Two steps of every six are out of all bounds for both signals, so that no six follow on each other.
    const comparisonWhere = (wild: (k: number) => boolean) => {
      const random = new Random(46)
      const readings: Reading[] = []
      for (let k = 0; k < 3000; k++) {
        const level = random.normal()
        for (const name of ['a', 'b']) readings.push([name, 1e12 + 1000 * k, wild(k) ? 1e99 : 1e-5 * level])
      }
      return new Feeder({ truncateAt: 4 }).take(readings).maker.stepComparison
    }
    expect(comparisonWhere(() => false)!.step).toBeGreaterThan(0.9)
    expect(comparisonWhere((k) => k % 6 === 0)).toBeNull()
  })

  /** Frames of 10 signals with correlation ρ that update with a chance of `rate` a step; else the change waits. */
  function watched(rate: number, frames: number): EppsCheck {
    const random = new Random(42)
    const check = new EppsCheck()
    const waiting = new Float64Array(10)
    for (let t = 0; t < frames; t++) {
      const common = random.normal()
      const x = new Float64Array(10)
      for (let i = 0; i < 10; i++) {
        waiting[i] = waiting[i]! + Math.sqrt(rho) * common + Math.sqrt(1 - rho) * random.normal()
        if (random.uniform() >= rate) continue
        x[i] = (i + 1) * waiting[i]!
        waiting[i] = 0
      }
      check.push(x, new Uint8Array(10).fill(1))
    }
    return check
  }

  test('signals that update at every step show the same correlation at both, and no warning', () => {
    const check = watched(1, 6000)
    expect(Math.abs(check.comparison!.step - rho)).toBeLessThan(0.1)
    expect(Math.abs(check.comparison!.ratio - 1)).toBeLessThan(0.2)
    expect(check.warning).toBeNull()
  })

  test('signals that update more rarely than the step draw a warning with both figures', () => {
    const check = watched(0.3, 6000)
    // Geometric updates: ρ p/(2 − p) at one step.
    expect(Math.abs(check.comparison!.step - (rho * 0.3) / 1.7)).toBeLessThan(0.06)
    expect(check.comparison!.ratio).toBeLessThan(0.5)
    expect(check.warning).toMatch(/0\.\d\d at the step and 0\.\d\d at 6 steps/)
  })

  test('says nothing about independent signals, or before it has seen enough', () => {
    expect(watched(1, 60).comparison).toBeNull()
    const random = new Random(43)
    const check = new EppsCheck()
    for (let t = 0; t < 4000; t++)
      check.push(
        Float64Array.from({ length: 10 }, () => random.normal()),
        new Uint8Array(10).fill(1),
      )
    expect(check.warning).toBeNull()
  })

  test('a longer step in which a signal was missing is none for that signal', () => {
    const random = new Random(44)
    const check = new EppsCheck()
    for (let t = 0; t < 4000; t++) {
      const x = random.normal()
      check.push(Float64Array.of(x, x), Uint8Array.of(1, t % 6 === 5 ? 0 : 1))
    }
    expect(check.comparison).toBeNull()
  })
})
