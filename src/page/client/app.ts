import type { EnsembleView, FeedView, FindingView, PageView } from '../view.ts'
import { alertsPart } from './alert-part.ts'
import { el, KeyedList, say } from './dom.ts'
import { anchorOf, ensemblePart, overviewLine } from './ensemble-part.ts'
import { afterChange, worstFirst } from './model.ts'
import { Stream } from './stream.ts'
import { clock, demoWords, feedWords, findingWords, span, summaryWords } from './words.ts'

/** Draws the page from the stream. */
class Page {
  #view: PageView | null = null
  /** The monitor's clock less that of the browser since it started. */
  #offset = Date.now() - performance.now()
  #lostAt: number | null = null
  #isDrawing = false

  readonly #banner = el('p', { class: 'banner', role: 'alert', hidden: '' })
  readonly #status = el('p', { class: 'quiet' })
  readonly #demo = el('p', { class: 'quiet', hidden: '' })
  readonly #overview = el('ul', { class: 'overview' })
  readonly #sections = el('div')
  readonly #alerts = alertsPart()
  readonly #findings = el('ul', { class: 'plain' })
  readonly #noFindings = el('p', { class: 'quiet' }, 'Nothing was found wrong with a signal.')
  readonly #feeds = el('ul', { class: 'plain feeds' })
  readonly #cautions = el('ul', { class: 'plain' })
  readonly #build = el('p')

  readonly #lines = new KeyedList<EnsembleView, HTMLLIElement>(this.#overview, nameOf, overviewLine)
  readonly #parts = new KeyedList<EnsembleView, HTMLElement>(this.#sections, nameOf, ({ name }) =>
    ensemblePart(name, () => this.#now()),
  )
  readonly #findingLines = textLines<FindingView>(
    this.#findings,
    ({ ensemble, signal, finding, from }) => JSON.stringify([ensemble, signal, finding, from]),
    (finding) => `${this.#titleOf(finding.ensemble)}, ${findingWords(finding)}`,
  )
  readonly #feedLines = textLines<FeedView>(
    this.#feeds,
    nameOf,
    (feed) => `${feed.name}: ${feedWords(feed)}`,
    ({ connected }) => connected === false,
  )
  readonly #cautionLines = textLines<string>(this.#cautions, String, String)

  constructor(root: Element) {
    root.replaceChildren(
      this.#banner,
      el('header', {}, el('h1', {}, 'Tautline'), this.#status, this.#demo),
      el(
        'main',
        {},
        el('section', { 'aria-label': 'States, worst first' }, this.#overview),
        this.#alerts.node,
        this.#sections,
        el('section', {}, el('h2', {}, 'Signals found wanting'), this.#noFindings, this.#findings),
        el('section', {}, el('h2', {}, 'Feeds'), this.#feeds),
      ),
      el('footer', {}, this.#cautions, this.#build),
    )
    setInterval(() => this.#draw(), 1000)
    const page = this
    new Stream({
      state(view) {
        const isFirst = page.#view === null
        page.#view = view
        page.#drawSoon()
        if (isFirst) page.#goToLinked()
      },
      change(change) {
        if (page.#view !== null) page.#view = afterChange(page.#view, change)
        page.#drawSoon()
      },
      time(now) {
        page.#offset = now - performance.now()
      },
      lost() {
        page.#lostAt = page.#now()
        page.#draw()
      },
      back() {
        page.#lostAt = null
        page.#drawSoon()
      },
    })
  }

  #now(): number {
    return performance.now() + this.#offset
  }

  #titleOf(name: string): string {
    return this.#view?.ensembles.find((ensemble) => ensemble.name === name)?.title ?? name
  }

  #drawSoon(): void {
    if (this.#isDrawing) return
    this.#isDrawing = true
    requestAnimationFrame(() => {
      this.#isDrawing = false
      this.#draw()
    })
  }

  #draw(): void {
    const view = this.#view
    this.#drawLink()
    if (view === null) return
    const ordered = worstFirst(view.ensembles)
    this.#lines.update(ordered)
    this.#parts.update(ordered)
    this.#alerts.update(view.alerts)
    this.#findingLines.update(view.findings)
    this.#noFindings.hidden = view.findings.length > 0
    this.#feedLines.update(view.feeds)
    this.#cautionLines.update(view.cautions)
    say(this.#build, `Tautline ${view.version}. Times are UTC.`)
    this.#demo.hidden = view.demo === null
    if (view.demo !== null) say(this.#demo, demoWords(view.demo))
  }

  #drawLink(): void {
    const view = this.#view
    const isLost = this.#lostAt !== null
    document.body.classList.toggle('lost', isLost)
    this.#banner.hidden = !isLost
    if (this.#lostAt !== null)
      say(
        this.#banner,
        `The connection to the monitor has been lost for ${span(this.#now() - this.#lostAt)}. What stands here is old: it is of ${clock(this.#lostAt)} UTC or before. Trying again.`,
      )
    const summary = view === null ? 'Asking the monitor for its state.' : `${summaryWords(view)}.`
    say(this.#status, isLost ? `When it was last heard of: ${summary}` : summary)
    const title = view === null ? 'Tautline' : `${summaryWords(view)} · Tautline`
    const said = isLost ? 'connection lost · Tautline' : title
    if (document.title !== said) document.title = said
  }

  /** Follows the `?ensemble=` of a link in an alert. */
  #goToLinked(): void {
    const name = new URLSearchParams(location.search).get('ensemble')
    if (name === null) return
    requestAnimationFrame(() =>
      requestAnimationFrame(() =>
        document.getElementById(anchorOf(name))?.scrollIntoView({ behavior: 'instant' }),
      ),
    )
  }
}

const nameOf = ({ name }: { readonly name: string }): string => name

function textLines<T>(
  parent: Element,
  key: (item: T) => string,
  words: (item: T) => string,
  isUnwell: (item: T) => boolean = () => false,
) {
  return new KeyedList<T, HTMLLIElement>(parent, key, () => {
    const node = el('li')
    return {
      node,
      update(item) {
        say(node, words(item))
        node.classList.toggle('unwell', isUnwell(item))
      },
    }
  })
}

const root = document.getElementById('page')
if (root !== null) new Page(root)
