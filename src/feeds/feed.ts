import type { Observable } from 'rxjs'
import type { DropCounts, DropReason } from '../reasons.ts'

/**
 * Readings as columns. `signal[i]` is the index of the signal's name in `names`, a list that only grows and
 * is shared by all batches of one feed; `time[i]` is the event time in milliseconds since 1970-01-01 UTC
 * (fractions allowed); `value[i]` is finite. Only the first `count` entries are valid; the arrays may be
 * reused by the feed after `done()`.
 */
export interface ReadingBatch {
  readonly count: number
  readonly names: readonly string[]
  readonly signal: Int32Array
  readonly time: Float64Array
  readonly value: Float64Array
  /** Records and readings dropped while this batch was read, by reason. */
  readonly dropped: DropCounts
}

/** A record that could not be read, kept so that the user can look at it. */
export interface QuarantinedRecord {
  readonly feed: string
  /** Topic and partition, file name, or `stdin`. */
  readonly source: string
  /** Offset on Kafka; line number (from 1) in a file. A decimal string: offsets are 64-bit. */
  readonly position: string
  readonly reason: DropReason
  readonly detail: string
  /** The first bytes of the record (at most 200), control characters escaped. */
  readonly start: string
  /** Milliseconds since 1970, by the clock that the feed was given. */
  readonly at: number
}

/** Where reading goes on after a restart: opaque to all but the feed that made it; JSON-serialisable. */
export type Position = Readonly<Record<string, string>>

export type FeedEvent =
  /** A batch of one source. The source gives its next one only after `done()` was called. */
  | {
      readonly type: 'batch'
      readonly source: string
      readonly batch: ReadingBatch
      readonly quarantined: readonly QuarantinedRecord[]
      /** Position after this batch, for `resumeAt` of the next run; entries of this source only. */
      readonly position: Position
      /** Messages (Kafka) or bytes (files) that are still to be read in this source, when known. */
      readonly behind: number | null
      /** Called once, when the last effect of the batch is in the pipeline's state. */
      done(): void
    }
  /** Sources that now belong to this feed; a source not yet heard of holds the ensemble's watermark. */
  | { readonly type: 'assigned'; readonly sources: readonly string[] }
  | { readonly type: 'revoked'; readonly sources: readonly string[] }
  /** The source is read up to its present end (a live source may go on later). */
  | { readonly type: 'caught-up'; readonly source: string }
  /** The source will give no more. */
  | { readonly type: 'ended'; readonly source: string }
  | { readonly type: 'connected' }
  | { readonly type: 'disconnected'; readonly detail: string }

/**
 * A way in for readings. `events` is cold: subscribing opens the feed, unsubscribing closes it after the
 * batch in hand. It completes when all sources have ended and errors only for what a user must mend
 * (`TautlineError`); a broker that is away is an event, not an error.
 */
export interface Feed {
  readonly name: string
  readonly kind: 'file' | 'stdin' | 'kafka' | 'generated'
  readonly events: Observable<FeedEvent>
  /** Holds (true) or releases (false) a source whose event time has run far ahead of the others. */
  hold(source: string, held: boolean): void
  /** Makes positions durable at the sender where it keeps them (Kafka's committed offsets). */
  commit(position: Position): Promise<void>
  /** Tries the feed without reading from it for good: for `tautline check`. */
  check(): Promise<{ readonly ok: boolean; readonly detail: string }>
}
