import type { Bar, EnsembleView } from '../view.ts'
import { el, KeyedList, say } from './dom.ts'
import { percent } from './words.ts'

/** `signal` null: all that is not named. */
export interface CarrierRow {
  readonly signal: string | null
  readonly share: number
}

type Carried = Pick<EnsembleView, 'shift' | 'leaders'>

/** Who carries the shift that stands, else who leads the present leading mode, and the rest: they add up to 1. */
export function carrierRows({ shift, leaders }: Carried): readonly CarrierRow[] {
  const bars: readonly Bar[] = shift?.carriers ?? leaders
  if (bars.length === 0) return []
  const rest = shift === null ? 1 - bars.reduce((sum, { share }) => sum + share, 0) : shift.remainder
  return rest === null || Math.abs(rest) < 0.0005 ? bars : [...bars, { signal: null, share: rest }]
}

/** What the bars are parts of, and what the rest is. */
export function carrierWords({ shift, leaders }: Carried): string {
  const rows = carrierRows({ shift, leaders })
  const hasRest = rows.some(({ signal }) => signal === null)
  const whole = shift?.remainder === null ? '' : ', which make 100 % together'
  const parts = shift === null ? 'Squared loadings of the leading mode' : 'Parts of the movement of the mode'
  const beyond =
    shift?.kind === 'strength' || shift?.kind === 'amplitude'
      ? ', and what the first order does not explain'
      : ''
  const others = hasRest ? ` The rest is the signals not named here${beyond}.` : ''
  const against = rows.some(({ share }) => share < 0) ? ' A hollow bar goes against the change.' : ''
  return `${parts}${whole}.${others}${against}`
}

export function carrierBars(): { readonly node: HTMLElement; update(ensemble: EnsembleView): void } {
  const [heading, rows, words] = [el('h3'), el('ol', { class: 'bars' }), el('p', { class: 'quiet' })]
  let longest = 1
  const list = new KeyedList<CarrierRow, HTMLLIElement>(
    rows,
    ({ signal }) => (signal === null ? 'rest' : `signal ${signal}`),
    ({ signal }) => {
      const [name, bar, share] = [el('span', { class: 'name' }), el('span', { class: 'bar' }), el('span')]
      const kind = signal === null ? { class: 'rest' } : {}
      return {
        node: el('li', kind, name, el('span', { class: 'track' }, bar), share),
        update({ share: part }) {
          say(name, signal ?? 'the rest')
          say(share, percent(part))
          const wide = `${((100 * Math.abs(part)) / longest).toFixed(1)}%`
          if (bar.style.width !== wide) bar.style.width = wide
          bar.classList.toggle('against', part < 0)
        },
      }
    },
  )
  const node = el('div', { class: 'carriers' }, heading, rows, words)
  return {
    node,
    update(ensemble) {
      const shown = carrierRows(ensemble)
      node.hidden = shown.length === 0
      longest = Math.max(...shown.map(({ share }) => Math.abs(share)), 1e-9)
      const { shift } = ensemble
      say(heading, shift === null ? 'Who leads the leading mode' : `Who carries shift ${shift.number}`)
      list.update(shown)
      say(words, carrierWords(ensemble))
    },
  }
}
