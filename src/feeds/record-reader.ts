import type { TautlineError } from '../errors.ts'
import type { BatchBuilder } from './batch-builder.ts'

/**
 * Reads records of one format out of bytes. A record's length is counted without its line feed. All readers
 * take an unreadable record as counted and kept (`BatchBuilder.refuse`); none throws.
 */
export interface RecordReader {
  /**
   * Reads whole records of `bytes[from, to)` until the batch is full, at least one, and gives the position
   * of the first unread one. What remains is the beginning of a record that goes on in bytes still to come;
   * when it is longer than the limit and holds no line feed, the caller refuses and skips it. `final`: no
   * bytes follow, and `bytes[to - 1]` is a line feed.
   */
  read(bytes: Buffer, from: number, to: number, final: boolean, out: BatchBuilder): number
  /** Reads all of a message that stands by itself in `bytes[from, to)`; `bytes[to]` must be a line feed. */
  message(bytes: Buffer, from: number, to: number, out: BatchBuilder): void
  /** Set when nothing more can be read until the user mends something. */
  readonly failure: TautlineError | null
}

/** Reads one document, such as a line of NDJSON, in `bytes[from, to)`. */
export type DocumentReader = (bytes: Buffer, from: number, to: number, out: BatchBuilder) => void

export const lineFeed = 10

export const tooLong = (limit: number): string => `the record is longer than ${limit} bytes`

/** Position after a byte order mark of UTF-8 at `from`. */
export const afterMark = (bytes: Buffer, from: number, to: number): number =>
  to - from >= 3 && bytes[from] === 0xef && bytes[from + 1] === 0xbb && bytes[from + 2] === 0xbf
    ? from + 3
    : from
