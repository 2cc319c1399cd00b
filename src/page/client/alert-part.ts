import type { AlertView } from '../view.ts'
import { el, KeyedList, say, set } from './dom.ts'
import { clock, spoken } from './words.ts'

function alertItem(): { readonly node: HTMLLIElement; update(alert: AlertView): void } {
  const [state, sentence, when] = [el('strong'), el('span'), el('p', { class: 'quiet' })]
  const details = el('ul', { class: 'plain' })
  const cautions = el('ul', { class: 'plain cautions' })
  const more = el('details', {}, el('summary', {}, 'Details and cautions'), details, cautions)
  const runbook = el('a', { rel: 'noreferrer' }, 'What to do')
  const book = el('p', {}, runbook)
  const node = el('li', {}, el('p', {}, state, ' ', sentence), when, book, more)
  return {
    node,
    update(alert) {
      set(node, {
        class: `alert ${alert.ended === null ? 'standing' : 'over'} ${alert.withheld === null ? '' : 'withheld'}`,
      })
      say(state, spoken(alert.state))
      say(sentence, alert.sentence)
      say(when, whenWords(alert))
      const isLink = alert.runbook !== null && /^https?:\/\//.test(alert.runbook)
      book.hidden = !isLink
      if (isLink) set(runbook, { href: alert.runbook ?? '' })
      lines(details, alert.details)
      lines(cautions, alert.cautions)
      more.hidden = alert.details.length + alert.cautions.length === 0
    },
  }
}

export function whenWords({ raised, ended, acknowledgedBy, withheld }: AlertView): string {
  const parts = [`Raised ${clock(raised)} UTC`]
  if (acknowledgedBy !== null) parts.push(`acknowledged by ${acknowledgedBy}`)
  if (withheld !== null)
    parts.push(
      `calls nobody, by ${withheld.by}: ${withheld.reason}${withheld.until === null ? '' : `, until ${clock(withheld.until, raised)} UTC`}`,
    )
  if (ended !== null) parts.push(`the signals have been steady again since ${clock(ended)} UTC`)
  return `${parts.join('; ')}.`
}

function lines(node: Element, texts: readonly string[]): void {
  if (
    node.childElementCount === texts.length &&
    texts.every((text, k) => node.children[k]?.textContent === text)
  )
    return
  node.replaceChildren(...texts.map((text) => el('li', {}, text)))
}

const mostOver = 8

/** The alerts that stand, and the last of those that are over. */
export function alertsPart(): { readonly node: HTMLElement; update(alerts: readonly AlertView[]): void } {
  const [rows, none] = [el('ul', { class: 'alerts' }), el('p', { class: 'quiet' })]
  const list = new KeyedList<AlertView, HTMLLIElement>(rows, ({ id }) => id, alertItem)
  const node = el(
    'section',
    { id: 'alerts', 'aria-labelledby': 'alerts-title' },
    el('h2', { id: 'alerts-title' }, 'Alerts'),
    none,
    rows,
  )
  return {
    node,
    update(alerts) {
      const standing = alerts.filter(({ ended }) => ended === null)
      const over = alerts.filter(({ ended }) => ended !== null).slice(0, mostOver)
      const hidden = alerts.length - standing.length - over.length
      const words = [
        ...(standing.length === 0 ? ['No alert stands.'] : []),
        ...(hidden > 0 ? [`${hidden} earlier ones are not listed here; tautline explain has them.`] : []),
      ]
      say(none, words.join(' '))
      none.hidden = words.length === 0
      list.update([...standing, ...over])
    },
  }
}
