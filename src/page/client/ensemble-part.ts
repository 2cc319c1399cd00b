import type { Bar, EnsembleView } from '../view.ts'
import { el, KeyedList, say, set } from './dom.ts'
import { shape } from './shape.ts'
import { strips } from './strips.ts'
import {
  certificateWords,
  distanceWords,
  edgeWords,
  frameWords,
  percent,
  sentenceOf,
  sightWords,
  signalsWords,
  sinceWords,
  spoken,
} from './words.ts'

interface Part<T, N extends Element> {
  readonly node: N
  update(item: T): void
}

export const anchorOf = (name: string): string => `ensemble-${name}`

/** One line at the head of the page: how an ensemble is. */
export function overviewLine(): Part<EnsembleView, HTMLLIElement> {
  const line = shape()
  const [title, state, since, sentence] = [el('a'), el('strong'), el('span'), el('p')]
  const head = el('p', { class: 'head' }, line.node, ' ', title, ' ', state, ' ', since)
  const node = el('li', {}, head, sentence)
  return {
    node,
    update(ensemble) {
      set(node, { class: ensemble.state })
      set(title, { href: `#${anchorOf(ensemble.name)}` })
      line.update(ensemble.state)
      say(title, ensemble.title)
      say(state, ensemble.state)
      say(since, sinceWords(ensemble))
      say(sentence, sentenceOf(ensemble))
    },
  }
}

/** An ensemble in full. `now` gives the present by the clock of the monitor. */
export function ensemblePart(name: string, now: () => number): Part<EnsembleView, HTMLElement> {
  const line = shape()
  const [title, state, since, why, signals] = [el('span'), el('strong'), el('span'), el('p'), el('p')]
  const past = strips()
  const bars = carrierBars()
  const figures = Array.from({ length: 5 }, () => el('p'))
  const statistics = el('ul', { class: 'plain' })
  const shown = new KeyedList<EnsembleView['statistics'][number], HTMLLIElement>(
    statistics,
    ({ statistic }) => statistic,
    () => textItem(({ statistic, ratio }) => `${spoken(statistic)}: ${percent(ratio)} of its limit`),
  )
  const node = el(
    'section',
    { id: anchorOf(name), 'aria-labelledby': `${anchorOf(name)}-title` },
    el('h2', { id: `${anchorOf(name)}-title` }, title, ' ', line.node, ' ', state),
    el('p', { class: 'quiet' }, since),
    why,
    past.node,
    bars.node,
    el(
      'details',
      {},
      el('summary', {}, 'The figures, and what they cannot see'),
      signals,
      ...figures,
      el('p', {}, 'Evidence of each statistic:'),
      statistics,
    ),
  )
  return {
    node,
    update(ensemble) {
      set(node, { class: ensemble.state })
      line.update(ensemble.state)
      say(title, ensemble.title)
      say(state, ensemble.state)
      const lasting = sinceWords(ensemble)
      say(
        since,
        [lasting === '' ? '' : `${sentenceCase(lasting)}.`, frameWords(ensemble, now())].join(' ').trim(),
      )
      say(why, ensemble.why === null ? sentenceOf(ensemble) : `Why ${ensemble.state}: ${ensemble.why}`)
      past.update(ensemble)
      bars.update(ensemble)
      say(signals, signalsWords(ensemble))
      const words = [edgeWords, distanceWords, sightWords, certificateWords].map((speak) => speak(ensemble))
      for (const [k, figure] of figures.entries()) say(figure, words[k] ?? '')
      shown.update(ensemble.statistics)
    },
  }
}

const sentenceCase = (text: string): string => text.charAt(0).toUpperCase() + text.slice(1)

function textItem<T>(words: (item: T) => string): Part<T, HTMLLIElement> {
  const node = el('li')
  return { node, update: (item) => say(node, words(item)) }
}

/** Who carries the shift that stands, else who leads the present leading mode. */
function carrierBars(): Part<EnsembleView, HTMLElement> {
  const [heading, rows, rest] = [el('h3'), el('ol', { class: 'bars' }), el('p', { class: 'quiet' })]
  let longest = 1
  const list = new KeyedList<Bar, HTMLLIElement>(
    rows,
    ({ signal }) => signal,
    () => {
      const [name, bar, share] = [el('span', { class: 'name' }), el('span', { class: 'bar' }), el('span')]
      return {
        node: el('li', {}, name, el('span', { class: 'track' }, bar), share),
        update({ signal, share: part }) {
          say(name, signal)
          say(share, percent(part))
          const wide = `${((100 * Math.abs(part)) / longest).toFixed(1)}%`
          if (bar.style.width !== wide) bar.style.width = wide
          bar.classList.toggle('against', part < 0)
        },
      }
    },
  )
  const node = el('div', { class: 'carriers' }, heading, rows, rest)
  return {
    node,
    update({ shift, leaders }) {
      const bars = shift?.carriers ?? leaders
      node.hidden = bars.length === 0
      longest = Math.max(...bars.map(({ share }) => Math.abs(share)), 1e-9)
      say(heading, shift === null ? 'Who leads the leading mode' : `Who carries shift ${shift.number}`)
      list.update(bars)
      const against = bars.some(({ share }) => share < 0) ? ' A hollow bar moves against the change.' : ''
      say(
        rest,
        shift === null
          ? 'Squared loadings; together over all signals they make 100 %.'
          : `Parts of the movement of the mode; the remainder beyond the first order is ${percent(shift.remainder)}.${against}`,
      )
    },
  }
}
