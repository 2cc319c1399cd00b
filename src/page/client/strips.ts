import type { EnsembleView, Point } from '../view.ts'
import { el, say, set, svg } from './dom.ts'
import { areaPath, linearScale, linePath, ratioScale, type Scale, stepPath } from './scale.ts'
import { clock, figure, percent } from './words.ts'

const width = 600
const height = 60

type Column = readonly (number | null)[]

interface Drawing {
  readonly scale: Scale
  readonly paths: readonly string[]
  /** What the drawing says, for those who do not see it. */
  readonly words: string
  readonly value: string
}

interface StripPlan {
  readonly label: string
  readonly note: string
  readonly lines: readonly string[]
  draw(columns: readonly Column[]): Drawing
}

const lastOf = (column: Column): number | null => column.at(-1) ?? null
const linear = (columns: readonly Column[], least: number) =>
  linearScale(columns.flat(), { low: 0, least, height })

/** Columns are those of `Point`, without the time. */
const plans: readonly StripPlan[] = [
  {
    label: 'Share of the leading mode',
    note: 'near 1, everything moves as one',
    lines: ['main'],
    draw([share = []]) {
      const scale = linear([share], 0.2)
      const value = percent(lastOf(share))
      return {
        scale,
        paths: [linePath(share, scale, width)],
        value,
        words: `share of the leading mode ${value}`,
      }
    },
  },
  {
    label: 'Largest eigenvalues',
    note: 'dashed: the edge of the noise; ratio scale',
    lines: ['dashed', 'second', 'main'],
    draw([, first = [], second = [], limit = []]) {
      const scale = ratioScale([...first, ...second, ...limit], { least: [1, 4], height })
      const value = figure(lastOf(first))
      return {
        scale,
        paths: [limit, second, first].map((column) => linePath(column, scale, width)),
        value,
        words: `largest eigenvalue ${value}, second ${figure(lastOf(second))}, edge of the noise ${figure(lastOf(limit))}`,
      }
    },
  },
  {
    label: 'Escapes',
    note: 'modes beyond the edge',
    lines: ['main'],
    draw([, , , , escapes = []]) {
      const scale = linear([escapes], 4)
      const value = figure(lastOf(escapes))
      return { scale, paths: [stepPath(escapes, scale, width)], value, words: `${value} escapes` }
    },
  },
  {
    label: 'Distance (W2)',
    note: 'from the reference, under its ceiling (shaded)',
    lines: ['shade', 'main'],
    draw([, , , , , w2 = [], ceiling = []]) {
      const scale = linear([w2, ceiling], 0.5)
      const value = figure(lastOf(w2))
      return {
        scale,
        paths: [areaPath(ceiling, scale, width, height), linePath(w2, scale, width)],
        value,
        words: `distance ${value} under a ceiling of ${figure(lastOf(ceiling))}`,
      }
    },
  },
  {
    label: 'Evidence for a change',
    note: 'dashed: its limit',
    lines: ['dashed', 'main'],
    draw([, , , , , , , evidence = []]) {
      const scale = linear([evidence], 1.2)
      const value = percent(lastOf(evidence))
      const limit = [1, 1]
      return {
        scale,
        paths: [linePath(limit, scale, width), linePath(evidence, scale, width)],
        value,
        words: `evidence at ${value} of its limit`,
      }
    },
  },
]

/** The past of an ensemble as strips over one axis of frames. */
export function strips(): { readonly node: HTMLElement; update(ensemble: EnsembleView): void } {
  const parts = plans.map(strip)
  const [from, to] = [el('span'), el('span')]
  const axis = el('p', { class: 'axis' }, from, to)
  const node = el('div', { class: 'strips' }, ...parts.map((part) => part.node), axis)
  return {
    node,
    update(ensemble) {
      const points = pointsOf(ensemble)
      node.hidden = points.length < 2 || points.every(([, share]) => share === null)
      if (node.hidden) return
      const columns = Array.from({ length: 8 }, (_, k) => points.map((point) => point[k + 1] ?? null))
      const marks = marksOf(ensemble, points)
      for (const part of parts) part.update(columns, marks)
      const last = points.at(-1)![0]
      const first = points[0]![0]
      say(from, `${clock(first)} UTC`)
      say(to, `${clock(last, first)} UTC`)
    },
  }
}

/** The history with the present behind it. */
function pointsOf({
  history,
  time,
  share,
  leading,
  edge,
  escapes,
  distance,
  evidence,
}: EnsembleView): readonly Point[] {
  if (time === null || time <= (history.at(-1)?.[0] ?? Number.NEGATIVE_INFINITY)) return history
  const now: Point = [
    time,
    share,
    leading[0] ?? null,
    leading[1] ?? null,
    edge?.limit ?? null,
    edge === null ? null : escapes.length,
    distance?.w2 ?? null,
    distance?.ceiling ?? null,
    evidence?.ratio ?? null,
  ]
  return [...history, now]
}

/** Where the shift that stands began and was confirmed, from 0 to `width`. */
function marksOf({ shift }: EnsembleView, points: readonly Point[]): readonly number[] {
  if (shift === null) return []
  return [shift.start, shift.confirmed].flatMap((at) => {
    const i = points.findIndex(([time]) => time >= at)
    return i <= 0 ? [] : [(width * i) / (points.length - 1)]
  })
}

function strip({ label, note, lines, draw }: StripPlan) {
  const value = el('span', { class: 'value' })
  const paths = lines.map((kind) => svg('path', { class: kind }))
  const marks = [svg('path', { class: 'mark begun' }), svg('path', { class: 'mark' })]
  const plot = svg(
    'svg',
    { viewBox: `0 0 ${width} ${height}`, preserveAspectRatio: 'none', role: 'img' },
    ...paths,
    ...marks,
  )
  const [high, low] = [el('span'), el('span')]
  const node = el(
    'div',
    { class: 'strip' },
    el('p', { class: 'label' }, el('span', { class: 'name' }, label), value, el('small', {}, note)),
    plot,
    el('p', { class: 'scale', 'aria-hidden': 'true' }, high, low),
  )
  return {
    node,
    update(columns: readonly Column[], at: readonly number[]): void {
      const drawing = draw(columns)
      say(value, drawing.value)
      say(high, figure(drawing.scale.high))
      say(low, figure(drawing.scale.low))
      set(plot, { 'aria-label': drawing.words })
      for (const [k, path] of paths.entries()) set(path, { d: drawing.paths[k] ?? '' })
      for (const [k, mark] of marks.entries())
        set(mark, { d: at[k] === undefined ? '' : `M${at[k].toFixed(1)} 0V${height}` })
    },
  }
}
