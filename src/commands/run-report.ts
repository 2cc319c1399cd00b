import { sentenceOf } from '../alerts/wording.ts'
import {
  type FindingRecord,
  findingRecord,
  type ShiftRecord,
  type SummaryRecord,
  shiftRecord,
  type TransitionRecord,
  transitionRecord,
} from '../observe/records.ts'
import type { Outcome } from '../pipeline.ts'

/** Findings that a report lists; the summary counts them all. */
const mostFindings = 10_000
/** Transitions and shifts that a report lists of each kind. */
const mostEntries = 100_000

/** The journal of a replayed run, and what came of it. */
export interface RunReport {
  readonly summary: SummaryRecord
  readonly shifts: readonly ShiftRecord[]
  /** The same in plain words. */
  readonly sentences: readonly string[]
  readonly journal: readonly TransitionRecord[]
  readonly findings: readonly FindingRecord[]
  readonly warnings: readonly string[]
  readonly cautions: readonly string[]
}

/** Gathers the report of a run, bounded. */
export class ReportBook {
  readonly shifts: ShiftRecord[] = []
  readonly sentences: string[] = []
  readonly journal: TransitionRecord[] = []
  readonly findings: FindingRecord[] = []

  readonly #titles: ReadonlyMap<string, string>

  /** `titles` of the ensembles by name. */
  constructor(titles: ReadonlyMap<string, string>) {
    this.#titles = titles
  }

  take({ judged, findings }: Outcome): void {
    for (const { ensemble, finding } of findings) {
      if (this.findings.length < mostFindings) this.findings.push(findingRecord(ensemble, finding))
    }
    for (const { ensemble, verdict } of judged) {
      for (const transition of verdict.transitions) {
        if (this.journal.length < mostEntries) this.journal.push(transitionRecord(ensemble, transition))
      }
      if (verdict.shift !== null && this.shifts.length < mostEntries) {
        this.shifts.push(shiftRecord(ensemble, verdict.shift))
        this.sentences.push(sentenceOf(this.#titles.get(ensemble) ?? ensemble, verdict.shift, null))
      }
    }
  }
}
