import { describe, expect, it } from 'vitest'
import { DistanceWatch } from '../../src/regime/distance-watch.ts'
import { Random } from '../../src/regime/random.ts'
import { readReference, recordOf } from '../../src/regime/reference-record.ts'
import { BoxcarWindow } from '../../src/window/boxcar-window.ts'
import { scene, solver } from './setup.ts'
import { Bench, frameOf, model, rotated, timeOfFrame, withMarket } from './simulate.ts'

const span = 60
const frames = 180
const n = 30

describe('learning', () => {
  it('lasts until the reference is complete and the window holds nothing of it', () => {
    const s = scene({ span, reference: { frames }, keep: true })
    s.play(model(s.random, n, 0.25, 0.1), frames + span + 5)
    const { verdicts, transitions } = s.bench.run
    expect(verdicts[0]!.learning).toEqual({ have: 1, want: frames + span })
    expect(verdicts[frames + span - 2]!.learning).toEqual({ have: frames + span - 1, want: frames + span })
    verdicts.forEach((v, t) => {
      const learning = t < frames + span - 1
      expect(v.state === 'learning').toBe(learning)
      expect(v.evidence === null).toBe(learning)
      expect(v.distance === null).toBe(learning)
    })
    expect(transitions.map((t) => [t.from, t.to, t.frame])).toEqual([
      ['learning', 'steady', frames + span - 1],
    ])
    expect(transitions[0]!.why).toMatch(/reference of 180 frames and 30 signals is complete/)
  })

  it('starts at the date given', () => {
    const s = scene({ span, reference: { since: timeOfFrame(100), frames } })
    s.play(model(s.random, n, 0.25, 0.1), 100 + frames + span)
    expect(s.bench.run.transitions.map((t) => t.frame)).toEqual([100 + frames + span - 1])
  })

  it('with a lagged reference and explicit limits lasts until both windows are full', () => {
    const s = scene({ span, reference: { lagged: 40 }, limits: { explicit: { frobenius: 50 } }, keep: true })
    s.play(model(s.random, n, 0.25, 0.1), 130)
    expect(s.bench.run.transitions.map((t) => t.frame)).toEqual([span + 40 - 1])
    expect(s.bench.run.verdicts[99]!.statistics).toHaveProperty('frobenius')
    expect(Object.keys(s.bench.run.verdicts[99]!.statistics)).toEqual(['frobenius'])
  })

  it('the limits are drawn a few at a time: no frame takes more than a few draws', () => {
    let solves = 0
    const counting = {
      solve(matrix: Float64Array, size: number, modes: number) {
        solves++
        return solver.solve(matrix, size, modes)
      },
    }
    const watch = new DistanceWatch(
      {
        window: { span, decay: null },
        reference: { frames },
        limits: { framesPerFalsePage: 5000 },
      },
      counting,
    )
    const bench = new Bench(new BoxcarWindow(span), watch, solver)
    const random = new Random(2)
    const m = model(random, n, 0.25, 0.1)
    let most = 0
    for (let t = 0; t < frames + span + 20; t++) {
      solves = 0
      bench.push(frameOf(m, random, 'normal'))
      most = Math.max(most, solves)
    }
    expect(most).toBeLessThanOrEqual(8)
    expect(most).toBeGreaterThan(1)
  })
})

describe('a change and what follows', () => {
  it('goes steady, straining, shifted, and steady again under a new reference, each step with its reason', () => {
    const s = scene({ span, reference: { frames }, keep: true }, 4)
    const before = model(s.random, n, 0.25, 0.1)
    const after = withMarket(before, 0.25, 0.7)
    s.play(before, 400)
    s.play(after, 500)
    const { transitions, shifts, ended, verdicts } = s.bench.run
    expect(transitions.map((t) => t.to)).toEqual(['steady', 'straining', 'shifted', 'steady'])
    transitions.forEach((t, k) => {
      expect(t.from).toBe(k === 0 ? 'learning' : transitions[k - 1]!.to)
      expect(t.why).toMatch(/^[A-Z].*\.$/)
    })
    expect(shifts.map((shift) => [shift.number, shift.kind])).toEqual([[1, 'strength']])
    const [shift] = shifts
    expect(shift!.frame).toBe(transitions[2]!.frame)
    expect(shift!.start).toBeLessThanOrEqual(shift!.confirmed)
    expect(shift!.startFrom).toBeLessThanOrEqual(shift!.start)
    expect(shift!.startTo).toBeGreaterThanOrEqual(shift!.start)
    expect(shift!.sight).toBeCloseTo(1 + Math.sqrt(n / span), 12)
    expect(shift!.spectrumBefore).toHaveLength(n)
    expect(ended).toEqual([{ number: 1, frame: transitions[3]!.frame }])
    // The new reference is learnt from frames since the change, and the window must leave it too.
    expect(ended[0]!.frame).toBeGreaterThanOrEqual(400 + frames + span - 25)
    expect(verdicts[shift!.frame + 1]!.learning).not.toBeNull()
    expect(verdicts.at(-1)!.evidence!.ratio).toBeLessThan(1)
  })

  it('ends early when the old regime returns', () => {
    const s = scene({ span, reference: { frames } }, 5)
    const before = model(s.random, n, 0.25, 0.1)
    s.play(before, 400)
    for (let t = 0; t < 150 && s.bench.run.shifts.length === 0; t++) s.play(withMarket(before, 0.25, 0.7), 1)
    const at = s.bench.run.shifts[0]!.frame
    s.play(before, 160)
    expect(s.bench.run.ended.map((e) => e.number)).toEqual([1])
    expect(s.bench.run.ended[0]!.frame).toBeLessThan(at + span + 60)
    expect(s.bench.run.transitions.at(-1)!.why).toMatch(/old regime has returned/i)
    s.play(before, 200)
    expect(s.bench.run.shifts).toHaveLength(1)
  })

  it('remembers regimes: one that comes back is most like itself', () => {
    const s = scene({ span, reference: { frames } }, 8)
    const first = model(s.random, n, 0.15, 0.3)
    const second = rotated(first, new Random(99))
    s.play(first, 400)
    s.play(second, 600)
    s.play(first, 300)
    const { shifts } = s.bench.run
    expect(shifts.map((shift) => shift.kind)).toEqual(['partners', 'partners'])
    expect(shifts[0]!.likeness.map((l) => l.regime)).toEqual([0])
    expect(shifts[1]!.likeness.map((l) => l.regime)).toEqual([0, 1])
    for (const { likeness } of shifts[1]!.likeness) {
      expect(likeness).toBeGreaterThan(0)
      expect(likeness).toBeLessThanOrEqual(1)
    }
  })

  it('a planned change is learnt without a page', () => {
    const planned = [{ from: timeOfFrame(390), to: timeOfFrame(420), note: 'pump 2 to pump 3' }]
    const s = scene({ span, reference: { frames }, planned }, 7)
    const before = model(s.random, n, 0.25, 0.1)
    s.play(before, 400)
    s.play(withMarket(before, 0.25, 0.7), 400)
    const { transitions, shifts } = s.bench.run
    expect(shifts).toEqual([])
    expect(transitions.map((t) => [t.to, t.frame])).toEqual([
      ['steady', frames + span - 1],
      ['learning', 390],
      ['steady', 420 + frames + span - 1],
    ])
    expect(transitions[1]!.why).toMatch(/pump 2 to pump 3/)
  })

  it('explicit limits take the place of learnt ones', () => {
    const verdictsUnder = (share: number) => {
      const s = scene(
        { span, reference: { frames }, limits: { explicit: { 'leading-share': share } }, keep: true },
        9,
      )
      const before = model(s.random, n, 0.25, 0.1)
      s.play(before, 300)
      s.play(withMarket(before, 0.25, 0.5), 100)
      return s.bench.run
    }
    const tight = verdictsUnder(0.15)
    expect(tight.shifts).toHaveLength(1)
    expect(tight.shifts[0]!.statistics).toEqual([
      { statistic: 'leading-share', value: expect.any(Number), limit: 0.15 },
    ])
    expect(tight.shifts[0]!.evidence.value / 0.15).toBeCloseTo(tight.shifts[0]!.evidence.ratio, 12)
    expect(verdictsUnder(0.6).shifts).toEqual([])
  })
})

describe('signals that come and go', () => {
  it('a dead transmitter and new listings do not restart the watch and are no shift', () => {
    const s = scene({ span, reference: { frames }, keep: true }, 10)
    const wide = model(s.random, 32, 0.25, 0.1)
    for (let t = 0; t < 600; t++) {
      const x = frameOf(wide, s.random, 'normal').slice(0, t < 350 ? n : 32)
      const present = new Uint8Array(x.length).fill(1)
      if (t >= 420) {
        x[3] = 0
        present[3] = 0
      }
      const v = s.bench.push(x, present)
      if (t >= frames + span - 1) expect(['steady', 'straining']).toContain(v.state)
      if (v.distance !== null) expect(v.distance.w2).toBeLessThanOrEqual(v.distance.ceiling + 1e-9)
    }
    expect(s.bench.run.shifts).toEqual([])
    expect(s.bench.watch.reference!.n).toBe(n)
  })

  it('a change is still seen on the signals in common, and the newly listed join the next reference', () => {
    const s = scene({ span, reference: { frames } }, 11)
    const wide = model(s.random, 33, 0.25, 0.1)
    const after = withMarket(wide, 0.25, 0.7)
    for (let t = 0; t < 900; t++) {
      const x = frameOf(t < 450 ? wide : after, s.random, 'normal').slice(0, t < 350 ? n : 33)
      const present = new Uint8Array(x.length).fill(1)
      if (t >= 420) present[3] = x[3] = 0
      s.bench.push(x, present)
    }
    expect(s.bench.run.shifts.map((shift) => shift.kind)).toEqual(['strength'])
    expect(s.bench.run.shifts[0]!.spectrumBefore).toHaveLength(n - 1)
    expect(s.bench.run.ended).toHaveLength(1)
    const { indices } = s.bench.watch.reference!
    expect(indices).toHaveLength(32)
    expect([...indices]).not.toContain(3)
    expect([...indices]).toContain(32)
  })

  it('when more than half of the reference is gone for a window, a new one is learnt without a page', () => {
    const s = scene({ span, reference: { frames } }, 13)
    const m = model(s.random, n, 0.25, 0.1)
    for (let t = 0; t < 700; t++) {
      const x = frameOf(m, s.random, 'normal')
      const present = new Uint8Array(n).fill(1)
      if (t >= 300) {
        for (let i = 0; i < 18; i++) present[i] = x[i] = 0
      }
      s.bench.push(x, present)
    }
    expect(s.bench.run.shifts).toEqual([])
    expect(s.bench.run.transitions.map((t) => t.to)).toEqual(['steady', 'learning', 'steady'])
    expect(s.bench.watch.reference!.n).toBe(12)
  })
})

describe('a reference from a file', () => {
  it('is written, read back, and found again by name in another order of the roster', () => {
    const s = scene({ span, reference: { frames } }, 14)
    const m = model(s.random, n, 0.25, 0.1)
    s.play(m, frames + span)
    const names = Array.from({ length: n }, (_, i) => `S${i}`)
    const json = JSON.parse(JSON.stringify(recordOf(s.bench.watch.reference!, names)))
    const read = readReference(json)
    if (!read.ok) throw read.error

    const again = scene({ span, reference: { from: read.value } }, 15)
    again.play(m, 300)
    expect(again.bench.run.transitions.map((t) => t.to)).toEqual(['steady'])
    expect(again.bench.run.transitions[0]!.frame).toBeLessThan(span + 55)
    expect([...again.bench.watch.reference!.matrix]).toEqual([...s.bench.watch.reference!.matrix])
    again.play(withMarket(m, 0.25, 0.7), 100)
    expect(again.bench.run.shifts.map((shift) => shift.kind)).toEqual(['strength'])
  })

  it.each([
    [[], 'names'],
    [{ names: ['a', 'a'], frames: 9, matrix: [] }, 'twice'],
    [{ names: ['a', 'b'], frames: 1.5, matrix: [] }, 'frames'],
    [{ names: ['a', 'b'], frames: 9, matrix: [[1, 0]] }, 'matrix'],
    [
      {
        names: ['a', 'b'],
        frames: 9,
        matrix: [
          [1, 0.2],
          [0.3, 1],
        ],
      },
      'row 2, column 1',
    ],
    [
      {
        names: ['a', 'b'],
        frames: 9,
        matrix: [
          [1, null],
          [0.3, 1],
        ],
      },
      'matrix',
    ],
    [
      {
        names: ['a', 'b'],
        frames: 9,
        matrix: [
          [2, 0],
          [0, 1],
        ],
      },
      'diagonal',
    ],
    [
      {
        names: ['a', 'b'],
        frames: 9,
        matrix: [
          [1, 0],
          [0, 1],
        ],
        scales: [0, 1],
      },
      'scales',
    ],
  ])('says what is wrong with %j', (json, part) => {
    const read = readReference(json)
    expect(read.ok).toBe(false)
    if (read.ok) return
    expect(read.error.code).toBe('reference-unreadable')
    expect(read.error.detail).toContain(part)
  })
})

describe('a snapshot', () => {
  it.each([
    ['a fixed reference', { reference: { frames: 90 } }],
    ['a lagged reference', { reference: { lagged: 30 } }],
  ] as const)('with %s goes on bit for bit, wherever it is taken', (_, options) => {
    const short = 30
    const play = (from: number, to: number, bench: Bench, source: readonly Float64Array[]): string[] => {
      const out: string[] = []
      for (let t = from; t < to; t++) out.push(JSON.stringify(bench.push(source[t]!)))
      return out
    }
    const random = new Random(21)
    const before = model(random, 12, 0.3, 0.2)
    const after = withMarket(before, 0.3, 0.75)
    const source = Array.from({ length: 500 }, (_x, t) =>
      frameOf(t < 200 || t > 320 ? before : after, random, 'normal'),
    )
    const make = () => scene({ span: short, ...options, limits: { framesPerFalsePage: 2000 } }, 3).bench
    const whole = play(0, 500, make(), source)
    expect(whole.some((v) => v.includes('"shift":{'))).toBe(true)
    const cuts = [1, 89, 95, 130, 214, 250, ...Array.from({ length: 6 }, () => random.below(500))]
    for (const cut of cuts) {
      const first = make()
      play(0, cut, first, source)
      const second = make()
      second.resume(structuredClone(first.suspend()))
      expect(play(cut, 500, second, source)).toEqual(whole.slice(cut))
    }
  })
})
