import { describe, expect, it } from 'vitest'
import { carrierRows, carrierWords } from '../../src/page/client/carrier-bars.ts'
import type { EnsembleView, ShiftView } from '../../src/page/view.ts'
import { emptyState, fullState, judged, shiftAt, timeOf } from './support/invented.ts'

const [desk, station, yard] = fullState().view(timeOf(900)).ensembles as readonly EnsembleView[]
const sumOf = (rows: readonly { readonly share: number }[]) => rows.reduce((sum, { share }) => sum + share, 0)

/** A desk under a shift that is `over`ridden. */
function shifted(over: Parameters<typeof shiftAt>[1]): { shift: ShiftView; leaders: [] } {
  const state = emptyState()
  state.judged(judged(860, { verdict: { state: 'shifted', shift: shiftAt(860, over) } }))
  return { shift: state.view(timeOf(860)).ensembles[0]!.shift!, leaders: [] }
}

describe('the bars of an ensemble', () => {
  it('add up to the whole, the rest being last', () => {
    for (const ensemble of [desk!, station!]) {
      const rows = carrierRows(ensemble)
      expect(sumOf(rows)).toBeCloseTo(1, 3)
      expect(rows.map(({ signal }) => signal).indexOf(null)).toBe(rows.length - 1)
    }
  })

  it('add up where some go against the change, and where the rest does', () => {
    const rows = carrierRows(
      shifted({
        carriers: [
          { signal: 'QUAY', share: 1.2 },
          { signal: 'MAST', share: -0.1 },
        ],
        remainder: -0.1,
      }),
    )
    expect(rows).toEqual([
      { signal: 'QUAY', share: 1.2 },
      { signal: 'MAST', share: -0.1 },
      { signal: null, share: -0.1 },
    ])
  })

  it('have no rest where the named signals are the whole, and none where it is not known', () => {
    const all = { carriers: [{ signal: 'QUAY', share: 1 }], remainder: 0 }
    expect(carrierRows(shifted(all))).toEqual([{ signal: 'QUAY', share: 1 }])
    const unknown = shifted({ ...all, remainder: Number.NaN })
    expect(carrierRows(unknown)).toEqual([{ signal: 'QUAY', share: 1 }])
    expect(carrierWords(unknown)).toBe('Parts of the movement of the mode.')
  })

  it('are none where nobody is known to carry anything', () => {
    expect(carrierRows(yard!)).toEqual([])
    expect(carrierRows(shifted({ carriers: [], remainder: 1 }))).toEqual([])
  })

  it('say what they are parts of and what the rest is', () => {
    expect(carrierWords(desk!)).toBe(
      'Parts of the movement of the mode, which make 100 % together. The rest is the signals not named here, and what the first order does not explain. A hollow bar goes against the change.',
    )
    expect(carrierWords(shifted({ kind: 'partners', carriers: [{ signal: 'QUAY', share: 0.4 }] }))).toContain(
      'The rest is the signals not named here.',
    )
    expect(carrierWords(station!)).toBe(
      'Squared loadings of the leading mode, which make 100 % together. The rest is the signals not named here.',
    )
  })
})
