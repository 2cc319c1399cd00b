import { describe, expect, it } from 'vitest'
import { cautions, quietCaution } from '../../src/alerts/wording.ts'
import { afterChange } from '../../src/page/client/model.ts'
import type { PageChange } from '../../src/page/view.ts'
import { raisedAndEnded } from '../alerts/support/shifts.ts'
import {
  emptyState,
  fullState,
  judged,
  lastFrame,
  learningFrame,
  shiftAt,
  timeOf,
  transition,
} from './support/invented.ts'

const now = timeOf(1000)
const desk = (state: ReturnType<typeof emptyState>) =>
  state.view(now).ensembles.find(({ name }) => name === 'desk')!

describe('the state that the page shows', () => {
  it('knows of every ensemble and feed before the first reading', () => {
    const view = emptyState().view(now)
    expect(view.ensembles.map(({ name, state, frame }) => [name, state, frame])).toEqual([
      ['desk', 'learning', null],
      ['station', 'learning', null],
      ['yard', 'learning', null],
    ])
    expect(view.feeds).toEqual([
      { name: 'ticks', connected: null, behind: null, readings: 0, dropped: {} },
      { name: 'station', connected: null, behind: null, readings: 0, dropped: {} },
    ])
  })

  it('says how much of the learning is done', () => {
    const state = emptyState()
    for (let frame = 0; frame < 63; frame++) state.judged(learningFrame(frame))
    expect(desk(state)).toMatchObject({
      state: 'learning',
      since: timeOf(0),
      learning: { have: 63, want: 200 },
      share: null,
      edge: null,
    })
  })

  it('dates a state by its transition, and does not pretend to know what happened before it looked', () => {
    const state = emptyState()
    state.judged(judged(500))
    expect(desk(state).since).toBeNull()
    state.judged(
      judged(501, {
        verdict: { state: 'straining', transitions: [transition(501, { to: 'straining', why: 'Because.' })] },
      }),
    )
    expect(desk(state)).toMatchObject({ state: 'straining', since: timeOf(501), why: 'Because.' })
  })

  it('takes the state of an earlier run from its last transition and its standing alert', () => {
    const state = emptyState()
    const shift = shiftAt(860)
    state.transition('desk', transition(860, { to: 'shifted', why: 'Shift 3.', shift: 3 }))
    state.alert(raisedAndEnded(shift)[0])
    expect(desk(state)).toMatchObject({ state: 'shifted', since: timeOf(860), shift: { number: 3 } })
  })

  it('shows the carriers of the shift that stands, largest first, at most ten, until it has ended', () => {
    const state = emptyState()
    const shift = shiftAt(860)
    state.judged(judged(860, { verdict: { state: 'shifted', shift } }))
    const shares = desk(state).shift!.carriers.map(({ share }) => Math.abs(share))
    expect(shares.length).toBe(10)
    expect([...shares].sort((a, b) => b - a)).toEqual(shares)
    const { carriers, remainder } = desk(state).shift!
    expect(carriers.reduce((sum, { share }) => sum + share, remainder!)).toBeCloseTo(1, 3)
    state.judged(judged(861, { verdict: { state: 'steady', ended: 3 } }))
    expect(desk(state).shift).toBeNull()
  })

  it('keeps a shift that is confirmed in the frame in which the one before ends', () => {
    const state = emptyState()
    state.judged(judged(860, { verdict: { state: 'shifted', shift: shiftAt(860) } }))
    state.judged(judged(900, { verdict: { state: 'shifted', ended: 3, shift: shiftAt(900, { number: 4 }) } }))
    expect(desk(state).shift?.number).toBe(4)
  })

  it('lets no figure through that is not finite', () => {
    const state = emptyState()
    const nan = Number.NaN
    state.judged(
      judged(1, {
        share: nan,
        leading: [nan, 2],
        certificate: Number.POSITIVE_INFINITY,
        spectrum: { age: 0, bound: nan },
        window: { frames: 10, effective: nan },
        verdict: {
          distance: { w2: nan, ceiling: nan, rotation: nan },
          evidence: { ratio: Number.POSITIVE_INFINITY, statistic: 'frobenius', since: null },
          statistics: { frobenius: nan },
          sight: nan,
          leaders: [{ signal: 'A', share: nan }],
        },
      }),
    )
    const said = JSON.stringify(state.view(now))
    expect(JSON.parse(said)).toEqual(state.view(now))
    expect(desk(state)).toMatchObject({ share: null, certificate: null, sight: null, leaders: [] })
    expect(desk(state).statistics).toEqual([{ statistic: 'frobenius', ratio: null }])
  })

  it('ignores frames, feeds and transitions of names that it was not given', () => {
    const state = emptyState()
    state.judged(judged(1, { ensemble: 'other' }))
    state.feed('other', { readings: 1 })
    state.transition('other', transition(1))
    expect(state.changes(now)).toBeNull()
  })

  it('adds up what a feed gave and dropped', () => {
    const state = emptyState()
    state.feed('ticks', { connected: true, readings: 10, dropped: { late: 2 } })
    state.feed('ticks', { behind: 7, readings: 5, dropped: { late: 1, unreadable: 4 } })
    expect(state.view(now).feeds[0]).toEqual({
      name: 'ticks',
      connected: true,
      behind: 7,
      readings: 15,
      dropped: { late: 3, unreadable: 4 },
    })
  })

  it('stays bounded whatever comes, and lets what is over go first', () => {
    const state = emptyState()
    const [standing] = raisedAndEnded({ number: 1, start: 1000 })
    state.alert(standing)
    state.finding('desk', { signal: 'LAST', finding: 'stuck', from: 0, to: null, detail: '' })
    for (let k = 2; k < 500; k++) {
      const [, ended] = raisedAndEnded({ number: k, start: 1000 * k })
      state.alert({ ...ended, raised: standing.raised + k })
      state.finding('desk', { signal: `S${k}`, finding: 'stale', from: k, to: k + 1, detail: '' })
    }
    const { alerts, findings } = state.view(now)
    expect(alerts.length).toBe(40)
    expect(alerts[0]?.id).toBe(standing.id)
    expect(alerts[1]?.id).toContain('desk/499/')
    expect(findings.length).toBe(60)
    expect(findings[0]?.signal).toBe('LAST')
  })

  it('takes the end of a finding for the finding that began, and no old version of an alert', () => {
    const state = emptyState()
    state.finding('desk', { signal: 'A', finding: 'stuck', from: 5, to: null, detail: '' })
    state.finding('desk', { signal: 'A', finding: 'stuck', from: 5, to: 9, detail: '' })
    expect(state.view(now).findings.map(({ to }) => to)).toEqual([9])
    const [first, second] = raisedAndEnded()
    state.alert(second)
    state.alert(first)
    expect(state.view(now).alerts.map(({ version }) => version)).toEqual([second.version])
  })

  it('shows the very cautions of alerts and heartbeats', () => {
    expect(emptyState().view(now).cautions).toEqual([...cautions, quietCaution])
  })

  it('gives the states by name for the heartbeat', () => {
    expect(fullState().states()).toEqual({ desk: 'shifted', station: 'steady', yard: 'learning' })
  })
})

describe('the changes that the page is told', () => {
  it('are none when nothing has happened', () => {
    const state = fullState()
    state.changes(now)
    expect(state.changes(now + 10_000)).toBeNull()
  })

  it('come at most four times a second for an ensemble, however fast its frames', () => {
    const state = emptyState()
    let told = 0
    for (let k = 0; k < 1000; k++) {
      state.judged(judged(k))
      if (state.changes(now + k) !== null) told++
    }
    expect(told).toBe(4)
  })

  it('go on when the clock is set back', () => {
    const state = emptyState()
    state.judged(judged(1))
    expect(state.changes(now)).not.toBeNull()
    state.judged(judged(2))
    expect(state.changes(now - 3_600_000)).not.toBeNull()
  })

  it('are small: one more frame costs less than three kilobytes', () => {
    const state = fullState()
    state.changes(now)
    state.judged(judged(lastFrame + 1))
    expect(JSON.stringify(state.changes(now + 1000)).length).toBeLessThan(3000)
  })

  it('make of an earlier view the present one', () => {
    const state = emptyState({ history: { points: 40, coarsest: 4 } })
    let view = state.view(now)
    let frame = 0
    for (let round = 1; round < 60; round++) {
      for (let k = 0; k < (round * 7) % 23; k++) state.judged(judged(frame++))
      if (round % 9 === 0) state.alert(raisedAndEnded({ number: round, start: 1000 * round })[0])
      if (round % 7 === 0)
        state.finding('desk', { signal: 'A', finding: 'stale', from: round, to: null, detail: '' })
      state.feed('ticks', { readings: round })
      // A view that is asked for in between must not take anything from the changes.
      if (round % 5 === 0) view = state.view(now + 1000 * round)
      const change = state.changes(now + 1000 * round)
      view = change === null ? view : afterChange(view, JSON.parse(JSON.stringify(change)) as PageChange)
      expect({ ...view, now: 0 }).toEqual({ ...state.view(now + 1000 * round), now: 0 })
    }
    expect(view.ensembles[0]?.history.length).toBeGreaterThan(20)
  })
})
