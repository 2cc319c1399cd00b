import type { EnsembleView } from '../view.ts'
import { set, svg } from './dom.ts'

/** A line for each state, told apart by its form alone: dotted, straight, bent, broken to another height. */
const forms = {
  learning: 'M2 10h2M9 10h2M16 10h2M23 10h2M29 10h1',
  steady: 'M2 10h28',
  straining: 'M2 14Q16 -6 30 14',
  shifted: 'M2 16h12M18 4h12',
} as const

export function shape(): { readonly node: SVGElement; update(state: EnsembleView['state']): void } {
  const path = svg('path')
  const node = svg('svg', { class: 'shape', viewBox: '0 0 32 20', 'aria-hidden': 'true' }, path)
  return {
    node,
    update(state) {
      set(path, { d: forms[state] })
    },
  }
}
