import type { EnsembleChange, EnsembleView, PageChange, PageView, Point } from '../view.ts'

/** The view after a change. What the change does not name stays the same object. */
export function afterChange(view: PageView, change: PageChange): PageView {
  const changed = new Map(change.ensembles.map((one) => [one.present.name, one]))
  return {
    ...view,
    now: change.now,
    ensembles: view.ensembles.map((ensemble) => {
      const news = changed.get(ensemble.name)
      return news === undefined
        ? ensemble
        : { ...news.present, history: historyAfter(ensemble, news).slice(-view.mostPoints) }
    }),
    alerts: change.alerts ?? view.alerts,
    findings: change.findings ?? view.findings,
    feeds: change.feeds ?? view.feeds,
  }
}

/** Points that are there already, because the state came between two changes, are not added again. */
function historyAfter({ history }: EnsembleView, { more, whole }: EnsembleChange): readonly Point[] {
  if (whole !== undefined) return whole
  if (more === undefined) return history
  const last = history.at(-1)?.[0] ?? Number.NEGATIVE_INFINITY
  return [...history, ...more.filter(([time]) => time > last)]
}

const urgency = { shifted: 0, straining: 1, learning: 2, steady: 3 } as const

/** Worst first; those of one state by evidence, then as the settings have them. */
export const worstFirst = (ensembles: readonly EnsembleView[]): readonly EnsembleView[] =>
  ensembles
    .map((ensemble, order) => ({ ensemble, order }))
    .sort(
      (a, b) =>
        urgency[a.ensemble.state] - urgency[b.ensemble.state] ||
        evidenceOf(b.ensemble) - evidenceOf(a.ensemble) ||
        a.order - b.order,
    )
    .map(({ ensemble }) => ensemble)

/** In steps of a tenth, so that two at rest do not change places with every frame. */
const evidenceOf = ({ state, evidence }: EnsembleView): number =>
  state === 'steady' ? 0 : Math.round(10 * (evidence?.ratio ?? 0))
