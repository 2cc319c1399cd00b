import { describe, expect, it } from 'vitest'
import { worstFirst } from '../../src/page/client/model.ts'
import {
  areaPath,
  linearScale,
  linePath,
  niceAbove,
  niceBelow,
  ratioScale,
  stepPath,
} from '../../src/page/client/scale.ts'
import {
  certificateWords,
  clock,
  demoWords,
  distanceWords,
  edgeWords,
  feedWords,
  figure,
  findingWords,
  frameWords,
  percent,
  sentenceOf,
  sightWords,
  signalsWords,
  sinceWords,
  span,
  summaryWords,
} from '../../src/page/client/words.ts'
import type { EnsembleView } from '../../src/page/view.ts'
import { emptyState, fullState, judged, learningFrame, shiftAt, timeOf } from './support/invented.ts'

const now = timeOf(900)
const view = fullState().view(now)
const [desk, station, yard] = view.ensembles as readonly [EnsembleView, EnsembleView, EnsembleView]
const [empty] = emptyState().view(now).ensembles as readonly [EnsembleView]

describe('an ensemble in words', () => {
  it('says in one sentence how it is', () => {
    expect(sentenceOf(empty)).toBe('No frame has been closed yet.')
    expect(sentenceOf(yard)).toBe('Learns what is usual: 63 of 200 frames. No change can be called yet.')
    expect(sentenceOf(station)).toBe(
      'The signals move together as in the reference; the evidence for a change is at 42 % of its limit.',
    )
    expect(sentenceOf(desk)).toBe(
      'Shift 3, confirmed: the same signals move together with another strength. It began about 10:08:25 UTC (between 10:07:10 and 10:08:50). The new reference is being learnt: 80 of 240 frames.',
    )
  })

  it('says what strains it, since when', () => {
    const state = emptyState()
    const evidence = { ratio: 0.84, statistic: 'spectral-distance', since: timeOf(495) }
    state.judged(judged(500, { verdict: { state: 'straining', evidence } }))
    expect(sentenceOf(state.view(now).ensembles[0]!)).toBe(
      'Evidence for a change gathers: spectral distance is at 84 % of its limit, near it since 09:41:20 UTC.',
    )
  })

  it.each([
    ['strength', 'the same signals move together with another strength'],
    ['partners', 'other signals move together than before'],
    ['amplitude', 'the same partners move by other amounts'],
    ['one-signal', 'one signal alone moves otherwise than before'],
  ] as const)('names a shift of the kind %s', (kind, words) => {
    const state = emptyState()
    state.judged(judged(860, { verdict: { state: 'shifted', shift: shiftAt(860, { kind }) } }))
    expect(sentenceOf(state.view(now).ensembles[0]!)).toContain(words)
  })

  it('says since when, and admits where it does not know', () => {
    expect(sinceWords(desk)).toBe('since 10:11:45 UTC, for 3 min 20 s')
    expect(sinceWords(empty)).toBe('')
    expect(sinceWords({ ...desk, since: null })).toBe('since before this run of the monitor began')
    expect(sinceWords({ ...desk, since: desk.since! - 86_400_000 })).toBe(
      'since 1 Nov 2026, 10:11:45 UTC, for 1 d 0 h',
    )
  })

  it('names the signals that are left out and why', () => {
    expect(signalsWords(station)).toBe('35 signals take part, left out: PT-103 (constant).')
    expect(signalsWords(desk)).toBe(
      '48 signals take part, none is left out; 1 without a value in the last frame.',
    )
    const absent = Array.from({ length: 30 }, (_, k) => ({ signal: `S${k}`, why: 'missing' }))
    const state = emptyState()
    state.judged(judged(500, { absent, signals: 1 }))
    expect(signalsWords(state.view(now).ensembles[0]!)).toMatch(
      /^1 signal takes part, left out: S0 .* and 10 more\.$/,
    )
  })

  it('puts edge, distance, sight limit and certificate into sentences', () => {
    expect(edgeWords(station)).toMatch(
      /^Noise alone reaches from 0\.26 to 2\.21 \(Marchenko–Pastur law, fit 0\.04\); above 2\.43 is an escape at the level 0\.01: 2 modes escape it: 10\.\d shared by about 44\.1 signals and 2\.\d+ shared by about 9\.2 signals\.$/,
    )
    expect(distanceWords(desk)).toMatch(
      /^The spectrum is 1\.31 from the reference \(W2\), under a ceiling of 1\.54; rotation share 0\.39: /,
    )
    expect(sightWords(desk)).toBe(
      'With 48 signals and a window of 200 frames, worth 187 independent ones, a mode weaker than 1.49 times the noise cannot be seen, whatever is done.',
    )
    expect(certificateWords(desk)).toBe(
      'Clipping of extreme values can have moved the spectrum (W2) by 0.013 at most.',
    )
  })

  it('says of each figure that is not known yet that it is not known', () => {
    const words = [edgeWords, distanceWords, sightWords, certificateWords].map((speak) => speak(yard))
    for (const text of words) expect(text).toMatch(/not known yet|no truncation certificate yet/)
    for (const text of [...words, sentenceOf(yard), sinceWords(yard)])
      expect(text).not.toMatch(/NaN|null|undefined/)
  })

  it('says how old the last frame is, and how far an older spectrum can be wrong', () => {
    const { arrived } = desk
    expect(frameWords(desk, arrived! + 7000)).toBe(
      'Last frame: number 900, ended 2 Nov 2026, 10:15:05 UTC, judged 7 s ago.',
    )
    expect(frameWords({ ...desk, spectrum: { age: 3, bound: 0.002 } }, arrived!)).toMatch(
      /; its spectrum is 3 frames old, wrong by 0\.002 \(W2\) at most\.$/,
    )
    expect(frameWords(empty, now)).toBe('No frame yet.')
  })
})

describe('the rest of the page in words', () => {
  it('sums up the states, worst first, and the feeds that are away', () => {
    expect(summaryWords(view)).toBe('1 shifted, 1 learning, 1 steady, 1 feed is not connected')
  })

  it('says of a feed whether it is connected, how far behind, and what it dropped for which reason', () => {
    expect(view.feeds.map(feedWords)).toEqual([
      'connected; 182,344 readings, dropped: 12 late, 1 unreadable.',
      'not connected, 40 behind; 32,436 readings, none dropped.',
    ])
    expect(feedWords(emptyState().view(now).feeds[0]!)).toBe('not heard of yet; 0 readings, none dropped.')
  })

  it('says of a finding since when, and until when', () => {
    expect(view.findings.map(findingWords)).toEqual([
      'PT-103: stuck from 2 Nov 2026, 09:50:55 UTC and lasts (the value has not moved for 2 min).',
      'KEEL: stale from 2 Nov 2026, 09:25:05 UTC until 09:26:45 UTC.',
    ])
    expect(
      findingWords({
        ...view.findings[1]!,
        signal: null,
        finding: 'out-of-order',
        to: view.findings[1]!.from,
      }),
    ).toBe('All signals: out of order from 2 Nov 2026, 09:25:05 UTC.')
  })

  it('says at which speed a demo runs', () => {
    expect(demoWords({ speed: 60, note: 'Invented.' })).toBe('Demo, at 60 times real time. Invented.')
    expect(demoWords({ speed: null, note: 'Invented.' })).toBe('Demo, as fast as it goes. Invented.')
  })

  it('writes times, spans, figures and percentages so that they fit a line', () => {
    expect(clock(timeOf(0))).toBe('2 Nov 2026, 09:00:05')
    expect(clock(timeOf(0), timeOf(9))).toBe('09:00:05')
    expect([0, 59_400, 61_000, 3_660_000, 90_000_000, -5].map(span)).toEqual([
      '0 s',
      '59 s',
      '1 min 1 s',
      '1 h 1 min',
      '1 d 1 h',
      '0 s',
    ])
    expect([0.123456, 1234.5, 0, null, undefined].map(figure)).toEqual(['0.123', '1230', '0', '–', '–'])
    expect([0.0312, -0.03, 0.42, 1.28, null].map(percent)).toEqual(['3.1 %', '−3.0 %', '42 %', '128 %', '–'])
  })
})

describe('worst first', () => {
  it('is shifted, straining, learning, steady; within straining the one with more evidence', () => {
    const state = emptyState({
      ensembles: ['a', 'b', 'c', 'd', 'e'].map((name) => ({ name, title: name })),
    })
    const straining = (ratio: number) => ({
      verdict: { state: 'straining', evidence: { ratio, statistic: 'frobenius', since: null } } as const,
    })
    state.judged(judged(1, { ensemble: 'a' }))
    state.judged(learningFrame(1, { ensemble: 'b' }))
    state.judged(judged(1, { ensemble: 'c', ...straining(0.8) }))
    state.judged(judged(1, { ensemble: 'd', ...straining(1.4) }))
    state.judged(judged(1, { ensemble: 'e', verdict: { state: 'shifted' } }))
    expect(worstFirst(state.view(now).ensembles).map(({ name }) => name)).toEqual(['e', 'd', 'c', 'b', 'a'])
  })
})

describe('the drawings', () => {
  const scale = linearScale([0, 1], { low: 0, least: 1, height: 100 })

  it('put larger values higher and stay inside', () => {
    expect(scale.at(1)).toBeLessThan(scale.at(0))
    for (const value of [-5, 0, 0.5, 1, 9]) {
      expect(scale.at(value)).toBeGreaterThanOrEqual(0)
      expect(scale.at(value)).toBeLessThanOrEqual(100)
    }
  })

  it('end a scale at a round number not below the largest value', () => {
    expect([0.2131, 1, 1.01, 7, 9, 123, 0].map(niceAbove)).toEqual([0.25, 1, 1.2, 8, 10, 150, 1])
    expect([0.824, 1, 1.01, 7, 9.9, 123, 0].map(niceBelow)).toEqual([0.8, 1, 1, 6, 8, 120, 1])
  })

  it('make equal ratios equally far on a ratio scale', () => {
    const ratio = ratioScale([1, 10, 100], { least: [1, 4], height: 100 })
    expect(ratio.at(1) - ratio.at(10)).toBeCloseTo(ratio.at(10) - ratio.at(100), 9)
    expect(Number.isFinite(ratio.at(0))).toBe(true)
  })

  it('break a line where a value is missing, and draw nothing of nothing', () => {
    const path = linePath([0, 1, null, 1, null], scale, 40)
    expect(path.match(/M/g)?.length).toBe(2)
    expect([linePath([], scale, 40), linePath([null, null], scale, 40)]).toEqual(['', ''])
    expect(stepPath([0, null, 1, 1], scale, 30)).toMatch(/^M0 \S+M20 \S+H30V\S+$/)
    expect(areaPath([null, 1, 1, null, 1], scale, 40, 100).match(/Z/g)?.length).toBe(2)
  })

  it('give no path a figure that is not finite', () => {
    for (const values of [[1], [1, 2], [null, 3]])
      for (const draw of [linePath, stepPath]) expect(draw(values, scale, 40)).not.toMatch(/NaN|Infinity/)
  })
})
