import type { Outcome } from '../pipeline.ts'
import { addDrops, type DropCounts } from '../reasons.ts'

/** What a run has seen so far. */
export class Totals {
  readings = 0
  dropped: DropCounts = {}
  frames = 0
  shifts = 0
  findings = 0

  take({ arrival, judged, findings, dropped }: Outcome): void {
    const { event } = arrival
    if (event.type === 'batch') {
      this.readings += event.batch.count
      for (const count of Object.values(event.batch.dropped)) this.readings += count
    }
    this.dropped = addDrops(this.dropped, dropped)
    this.frames += judged.length
    for (const { verdict } of judged) if (verdict.shift !== null) this.shifts++
    this.findings += findings.length
  }
}
