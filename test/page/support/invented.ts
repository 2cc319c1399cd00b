import type { Judged } from '../../../src/ensemble.ts'
import { PageState } from '../../../src/page/page-state.ts'
import type { Shift, Transition, Verdict } from '../../../src/regime/regime.ts'
import { shift as inventedShift, raisedAndEnded } from '../../alerts/support/shifts.ts'

export const start = Date.parse('2026-11-02T09:00:00Z')
export const stepMs = 5000
export const timeOf = (frame: number): number => start + (frame + 1) * stepMs

export const names = ['QUAY', 'MAST', 'KEEL', 'BUOY', 'HELM', 'SPAR', 'DECK', 'HULL', 'RUDD', 'WINCH', 'JIB']

interface Over extends Partial<Omit<Judged, 'verdict'>> {
  readonly verdict?: Partial<Verdict>
}

/** A judged frame of an invented ensemble that is steady, but for what is `over`ridden. */
export function judged(frame: number, { verdict = {}, ...over }: Over = {}): Judged {
  const wave = Math.sin(frame / 23) + 0.4 * Math.sin(frame / 5.3)
  const share = 0.213 + 0.012 * wave
  return {
    ensemble: 'desk',
    frame,
    time: timeOf(frame),
    signals: 48,
    missing: 0,
    clipped: 0,
    volatility: 1,
    window: { frames: 200, effective: 187.3 },
    absent: [],
    share,
    leading: [48 * share, 2.6 + 0.2 * wave, 2.1],
    bulk: {
      model: 'marchenko-pastur',
      lower: 0.26,
      upper: 2.21,
      level: 0.01,
      limit: 2.43,
      fit: 0.04,
      variance: 0.78,
      q: 0.256,
      momentQ: 0.25,
      escapes: [
        { value: 48 * share, signals: 44.1 },
        ...(wave > 0 ? [{ value: 2.6 + 0.2 * wave, signals: 9.2 }] : []),
      ],
    },
    certificate: 0.013,
    spectrum: { age: 0, bound: 0 },
    spent: { window: 0.1, spectrum: 0.4, bulk: 0.1, regime: 0.2 },
    ...over,
    verdict: {
      state: 'steady',
      learning: null,
      distance: { w2: 0.21 + 0.03 * wave, ceiling: 0.64 + 0.02 * wave, rotation: 0.89 },
      evidence: { ratio: 0.31 + 0.1 * wave, statistic: 'leading-share', since: null },
      statistics: { 'leading-share': 0.31 + 0.1 * wave, 'spectral-distance': 0.2, frobenius: 0.12 },
      sight: 1.49,
      shift: null,
      ended: null,
      transitions: [],
      leaders: names.slice(0, 10).map((signal, k) => ({ signal, share: 0.061 - 0.004 * k })),
      ...verdict,
    },
  }
}

/** A frame before window and reference are full. */
export const learningFrame = (frame: number, over: Over = {}): Judged =>
  judged(frame, {
    share: null,
    leading: [],
    bulk: null,
    certificate: null,
    spectrum: null,
    window: { frames: Math.min(frame + 1, 200), effective: Math.min(frame + 1, 200) },
    ...over,
    verdict: {
      state: 'learning',
      learning: { have: frame + 1, want: 200 },
      distance: null,
      evidence: null,
      statistics: {},
      sight: null,
      leaders: [],
      ...over.verdict,
    },
  })

export const transition = (frame: number, over: Partial<Transition> = {}): Transition => ({
  time: timeOf(frame),
  frame,
  from: 'learning',
  to: 'steady',
  why: 'The reference of 600 frames and 48 signals is complete, and the window holds nothing of it.',
  shift: null,
  ...over,
})

const carriers = names.map((signal, k) => ({ signal, share: k === 7 ? -0.03 : 0.16 / (k + 1) }))

export const shiftAt = (frame: number, over: Partial<Shift> = {}): Shift =>
  inventedShift({
    start: timeOf(frame - 40),
    startFrom: timeOf(frame - 55),
    startTo: timeOf(frame - 35),
    confirmed: timeOf(frame),
    frame,
    number: 3,
    carriers,
    remainder: 1 - carriers.reduce((sum, { share }) => sum + share, 0),
    ...over,
  })

export const emptyState = (over: Partial<ConstructorParameters<typeof PageState>[0]> = {}): PageState =>
  new PageState({
    version: '1.2.3',
    demo: null,
    ensembles: [
      { name: 'desk', title: 'Northern desk' },
      { name: 'station', title: 'Pumping station' },
      { name: 'yard', title: 'Tank yard' },
    ],
    feeds: ['ticks', 'station'],
    ...over,
  })

/** The last frame of `fullState`. */
export const lastFrame = 900

/**
 * A state with all that can be: a steady station that leaves a transmitter out, a desk that strained and
 * shifted at frame 860, a yard that learns, alerts that stand and are over, findings, feeds with drops.
 */
export function fullState(over: Parameters<typeof emptyState>[0] = {}): PageState {
  const state = emptyState(over)
  const confirmed = shiftAt(860)
  for (let frame = 0; frame <= lastFrame; frame++) {
    if (frame < 240)
      state.judged(learningFrame(frame, { verdict: { learning: { have: frame + 1, want: 240 } } }))
    else state.judged(deskFrame(frame, confirmed))
    state.judged(stationFrame(frame))
    if (frame < 63) state.judged(learningFrame(frame, { ensemble: 'yard', signals: 12 }))
  }
  const [ended] = raisedAndEnded({ number: 2, start: start - 7.2e6, confirmed: start - 6e6 }).slice(1)
  const [standing] = raisedAndEnded(confirmed)
  state.alert({ ...ended!, raised: start - 6e6 })
  state.alert({ ...standing, raised: timeOf(860) + 900 })
  state.finding('station', {
    signal: 'PT-103',
    finding: 'stuck',
    from: timeOf(610),
    to: null,
    detail: 'the value has not moved for 2 min',
  })
  state.finding('desk', { signal: 'KEEL', finding: 'stale', from: timeOf(300), to: timeOf(320), detail: '' })
  state.feed('ticks', { connected: true, behind: 0, readings: 182_344, dropped: { late: 12, unreadable: 1 } })
  state.feed('station', { connected: false, behind: 40, readings: 32_436 })
  return state
}

function deskFrame(frame: number, shift: Shift): Judged {
  const rise = Math.min(1, Math.max(0, (frame - 820) / 60))
  const calm = judged(frame)
  const share = calm.share! + 0.17 * rise
  const ratio = 0.31 + 1.5 * rise
  const straining = transition(845, {
    from: 'steady',
    to: 'straining',
    why: 'Leading-share is at 93 % of its limit, 6 frames in a row near it.',
  })
  const moved: Transition = transition(860, {
    from: 'straining',
    to: 'shifted',
    why: 'Shift 3 (strength): leading-share is at 128 % of its limit for 15 frames, and stays beyond with no frame taken as louder than usual.',
    shift: 3,
  })
  return judged(frame, {
    share,
    missing: 1,
    leading: [48 * share, calm.leading[1]!, 2.1],
    verdict: {
      ...calm.verdict,
      state: frame < 845 ? 'steady' : frame < 860 ? 'straining' : 'shifted',
      learning: frame < 860 ? null : { have: frame - 820, want: 240 },
      transitions:
        frame === 240 ? [transition(240)] : frame === 845 ? [straining] : frame === 860 ? [moved] : [],
      shift: frame === 860 ? shift : null,
      distance: { w2: 0.21 + 1.1 * rise, ceiling: 0.64 + 0.9 * rise, rotation: 0.89 - 0.5 * rise },
      evidence: { ratio, statistic: 'leading-share', since: rise > 0 ? timeOf(825) : null },
      statistics: { 'leading-share': ratio, 'spectral-distance': 0.4 + rise, frobenius: 0.3 + 0.4 * rise },
    },
  })
}

function stationFrame(frame: number): Judged {
  if (frame < 240) return learningFrame(frame, { ensemble: 'station', signals: 36 })
  const { leading, share } = judged(frame + 71)
  return judged(frame, {
    ensemble: 'station',
    signals: 35,
    share: share! / 1.4,
    leading: leading.map((value) => value / 1.9),
    absent: frame > 620 ? [{ signal: 'PT-103', why: 'constant' }] : [],
    verdict: {
      transitions: frame === 240 ? [transition(240)] : [],
      leaders: ['FT-201', 'PT-101', 'PT-102', 'LT-004'].map((signal, k) => ({
        signal,
        share: 0.11 - 0.02 * k,
      })),
    },
  })
}
