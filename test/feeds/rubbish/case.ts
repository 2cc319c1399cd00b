import type { ErrorCode } from '../../../src/errors.ts'
import type { DropCounts } from '../../../src/reasons.ts'
import type { FormatSettings } from '../../../src/settings/schema.ts'

/** What must come of a bad input: so many readings, so many drops by reason, and for some an error. */
export interface Expected extends DropCounts {
  readonly readings?: number
  readonly error?: ErrorCode
}

/** A bad input: title, content (made when it is wanted: some are large), and what must come of it. */
export type Case = readonly [title: string, content: string | Buffer | (() => Buffer), expected: Expected]

export interface CaseGroup {
  readonly title: string
  readonly format: FormatSettings
  readonly cases: readonly Case[]
}

/** 2023-11-14T22:13:20Z in milliseconds. */
export const t = 1_700_000_000_000

/** A good line of NDJSON. */
export const good = `{"signal":"QUAY","time":${t},"value":101.25}`

/** Longest record in the corpus, bytes. */
export const limit = 64 * 1024
