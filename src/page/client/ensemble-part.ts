import type { EnsembleView } from '../view.ts'
import { carrierBars } from './carrier-bars.ts'
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
