import { describe, expect, test } from 'vitest'
import { rfc3339 } from '../../src/alerts/times.ts'
import { cautions, detailsOf, sentenceOf } from '../../src/alerts/wording.ts'
import { shiftKinds } from '../../src/regime/regime.ts'
import { at, shift } from './support/shifts.ts'

const sentence = (over: Parameters<typeof shift>[0] = {}, ended: number | null = null) =>
  sentenceOf('Northern desk', shift(over), ended)

describe('the sentence says what changed, since when and who carries it', () => {
  test('strength, up', () => {
    expect(sentence()).toBe(
      'Northern desk: the same signals have moved together more strongly since 2026-11-02T10:39:50Z (the share of the leading mode rose from 21 % to 38 %); QUAY and MAST carry most of it.',
    )
  })

  test('strength, down', () => {
    expect(sentence({ shareBefore: 0.381, shareAfter: 0.213 })).toContain(
      'have moved together more weakly since 2026-11-02T10:39:50Z (the share of the leading mode fell from 38 % to 21 %)',
    )
  })

  test('shares that round to the same whole percent are told to the hundredth', () => {
    expect(sentence({ shareBefore: 0.2131, shareAfter: 0.2149 })).toContain('rose from 21.31 % to 21.49 %')
  })

  test('partners', () => {
    expect(sentence({ kind: 'partners' })).toBe(
      'Northern desk: other signals have moved together than before since 2026-11-02T10:39:50Z; QUAY and MAST carry most of it.',
    )
  })

  test('amplitude, up and down after the sum of the spectrum', () => {
    const one = { kind: 'amplitude', spectrumBefore: [2, 1], spectrumAfter: [4, 2] } as const
    expect(sentence(one)).toContain('the same partners have moved more widely since')
    expect(sentence({ ...one, spectrumAfter: [1, 0.5] })).toContain('less widely')
  })

  test('one signal', () => {
    expect(sentence({ kind: 'one-signal', carriers: [{ signal: 'PT-103', share: 0.97 }] })).toBe(
      'Northern desk: PT-103 alone has moved otherwise than before since 2026-11-02T10:39:50Z.',
    )
  })

  test('carriers with small parts are not said to carry most of it; none is said to be none', () => {
    const carriers = ['A', 'B', 'C', 'D'].map((signal) => ({ signal, share: 0.06 }))
    expect(sentence({ carriers })).toContain('; A, B and C carry the largest parts of it.')
    expect(sentence({ carriers: [] })).toContain('; no signal stands out as its carrier.')
    expect(sentence({ carriers: [{ signal: 'A', share: 0.8 }] })).toContain('; A carries most of it.')
  })

  test('after the end: since when it is steady, and what was', () => {
    expect(sentence({}, at('11:30:00'))).toBe(
      'Northern desk has been steady again since 2026-11-02T11:30:00Z; from 2026-11-02T10:39:50Z on, the same signals had moved together more strongly (the share of the leading mode rose from 21 % to 38 %); QUAY and MAST carried most of it.',
    )
  })
})

test('no kind of shift and no missing number puts NaN, Infinity or undefined before a reader', () => {
  const bad = Number.NaN
  for (const kind of shiftKinds)
    for (const value of [bad, Number.POSITIVE_INFINITY, 0]) {
      const odd = shift({
        kind,
        shareBefore: value,
        shareAfter: bad,
        distance: { w2: value, ceiling: bad, rotation: value },
        evidence: { statistic: 'distance', value, limit: bad, ratio: value },
        certificate: value,
        sight: value,
        remainder: value,
        carriers: [],
        likeness: [],
        spectrumBefore: [value],
        spectrumAfter: [bad],
      })
      const text = [sentenceOf('Desk', odd, null), sentenceOf('Desk', odd, 1e12), ...detailsOf(odd)].join(
        '\n',
      )
      expect(text).not.toMatch(/NaN|Infinity|undefined|null/)
    }
})

test('names from outside cannot break lines, turn the reading direction or fill the sentence', () => {
  const text = sentenceOf(
    'Desk\nFAKE: all clear',
    shift({ carriers: [{ signal: `a\u202eb\u0007${'x'.repeat(300)}`, share: 0.9 }] }),
    null,
  )
  expect(text).not.toMatch(/[\n\u202e\u0007]/)
  expect(text.length).toBeLessThan(350)
})

test('the details hold every number of the shift with its meaning', () => {
  expect(detailsOf(shift())).toEqual([
    'Shift 3, confirmed 2026-11-02T10:42:05Z; it began between 2026-11-02T10:38:00Z and 2026-11-02T10:40:10Z.',
    'Share of the leading mode: 0.213 before, 0.381 after.',
    'Distance between the spectra (W2): 0.424, under its ceiling of 0.771; rotation share 0.698 (near 0 the strengths changed, near 1 the partners).',
    'Evidence: leading-strength at 5.31 against its limit of 4 (1.33 times the limit).',
    'Truncation certificate: 0.0131; clipping extreme values moved the spectrum (W2) by no more than this.',
    'Sight limit: 1.49 times the noise; a mode weaker than this cannot be seen in a window of this length.',
    'Carriers, with their shares: QUAY 0.31, MAST 0.22, KEEL -0.02; remainder 0.49.',
    'Likeness to earlier regimes, 1 being the same: regime 2 (0.93).',
  ])
})

test('the cautions say: no cause, no safety function, no code alarm replaced, no investment advice', () => {
  const text = cautions.join(' ')
  for (const words of [
    'not cause',
    'no safety function',
    'a code requires',
    'trained person',
    'no investment advice',
  ])
    expect(text).toContain(words)
})

test('times are RFC 3339 in UTC, with milliseconds only where there are some', () => {
  expect(rfc3339(at('10:42:05'))).toBe('2026-11-02T10:42:05Z')
  expect(rfc3339(at('10:42:05') + 120.4)).toBe('2026-11-02T10:42:05.120Z')
})
