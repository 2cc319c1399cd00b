import type { Alert, AlertEvent } from '../../../src/alerts/alert.ts'
import { AlertBook } from '../../../src/alerts/alert-book.ts'
import type { Shift } from '../../../src/regime/regime.ts'

export const at = (time: string): number => Date.parse(`2026-11-02T${time}Z`)

export const shift = (over: Partial<Shift> = {}): Shift => ({
  number: 3,
  kind: 'strength',
  start: at('10:39:50'),
  startFrom: at('10:38:00'),
  startTo: at('10:40:10'),
  confirmed: at('10:42:05'),
  frame: 1234,
  carriers: [
    { signal: 'QUAY', share: 0.31 },
    { signal: 'KEEL', share: -0.02 },
    { signal: 'MAST', share: 0.22 },
  ],
  remainder: 0.49,
  shareBefore: 0.213,
  shareAfter: 0.381,
  distance: { w2: 0.424, ceiling: 0.771, rotation: 0.698 },
  evidence: { statistic: 'leading-strength', value: 5.31, limit: 4, ratio: 1.3275 },
  certificate: 0.0131,
  sight: 1.49,
  likeness: [{ regime: 2, likeness: 0.93 }],
  spectrumBefore: [10.2, 2.4, 1.9],
  spectrumAfter: [18.3, 2.1, 1.2],
  statistics: [{ statistic: 'leading-strength', value: 5.31, limit: 4 }],
  ...over,
})

export const shiftEvent = (
  over: Partial<Shift> = {},
  { ensemble = 'desk', title = 'Northern desk', now = at('10:42:07') } = {},
): AlertEvent => ({ type: 'shift', ensemble, title, shift: shift(over), now })

export const steadyEvent = (number = 3, now = at('11:30:02'), ensemble = 'desk'): AlertEvent => ({
  type: 'steady',
  ensemble,
  shift: number,
  time: now - 2000,
  now,
})

export const book = (endedKept?: number): AlertBook =>
  new AlertBook({
    runbook: (ensemble) => (ensemble === 'desk' ? 'https://runbooks.example/desk' : null),
    page: 'https://monitor.example:8450/',
    ...(endedKept === undefined ? {} : { endedKept }),
  })

/** The alert of a shift in its first version, and in its second, which ends it. */
export function raisedAndEnded(over: Partial<Shift> = {}, ensemble = 'desk'): [Alert, Alert] {
  const alerts = book()
  const [raised] = alerts.take(shiftEvent(over, { ensemble }))
  const [ended] = alerts.take(steadyEvent(over.number ?? 3, at('11:30:02'), ensemble))
  return [raised!, ended!]
}
