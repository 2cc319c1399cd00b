import { TautlineError } from '../errors.ts'
import type { BatchBuilder } from './batch-builder.ts'
import { afterMark, lineFeed, type RecordReader, tooLong } from './record-reader.ts'

/** Bytes asked for at once. */
export const chunkSize = 256 * 1024

/**
 * Turns bytes that come in pieces into records. Holds at most the longest record and one piece: what is
 * longer is refused and skipped as it comes. What it finds does not depend on how the bytes were cut.
 */
export class RecordBuffer {
  failure: TautlineError | null = null
  readonly #reader: RecordReader
  readonly #limit: number
  #bytes = Buffer.allocUnsafe(2 * chunkSize)
  #start = 0
  #end = 0
  #offset: number
  /** Within a record that was refused for its length. */
  #skipping = false
  #final = false
  /** 1 when a line feed was put behind a last line without one. */
  #added = 0
  /** The first bytes were looked at for a byte order mark. */
  #begun: boolean

  /** `offset`: place of the first byte to come, in bytes from the beginning of the text. */
  constructor(reader: RecordReader, limit: number, offset = 0) {
    this.#reader = reader
    this.#limit = limit
    this.#offset = offset
    this.#begun = offset > 0
  }

  /** Where the first unread record begins, in bytes from the beginning of the text. */
  get offset(): number {
    return this.#start === this.#end ? this.#offset - this.#added : this.#offset
  }

  /** Room for the next piece: `length` bytes at `at`. */
  space(): { readonly bytes: Buffer; readonly at: number; readonly length: number } {
    const held = this.#end - this.#start
    const needed = held + chunkSize + 1
    if (needed > this.#bytes.length) {
      const larger = Buffer.allocUnsafe(Math.max(needed, Math.min(2 * needed, this.#limit + 2 * chunkSize)))
      this.#bytes.copy(larger, 0, this.#start, this.#end)
      this.#bytes = larger
      this.#start = 0
      this.#end = held
    } else if (this.#end + chunkSize + 1 > this.#bytes.length) {
      this.#bytes.copyWithin(0, this.#start, this.#end)
      this.#start = 0
      this.#end = held
    }
    return { bytes: this.#bytes, at: this.#end, length: chunkSize }
  }

  /** So many bytes were written into the room. */
  filled(length: number): void {
    this.#end += length
  }

  /** No bytes follow. `cutOff`: the text was damaged here, and its last line must not be taken as whole. */
  finish(cutOff: boolean): void {
    this.#final = true
    if (cutOff) {
      const end = this.#bytes.lastIndexOf(lineFeed, this.#end - 1) + 1
      this.#end = this.#end === 0 ? 0 : Math.max(this.#start, end)
    } else if (this.#end > this.#start && this.#bytes[this.#end - 1] !== lineFeed) {
      this.#bytes[this.#end++] = lineFeed
      this.#added = 1
    }
  }

  /** Goes on to a later place of the text; gives how many bytes, not yet here, must be left out for that. */
  jump(offset: number): number {
    const here = Math.min(this.#end - this.#start, Math.max(0, offset - this.#offset))
    const further = Math.max(0, offset - this.#offset - here)
    this.#start += here
    this.#offset += here + further
    this.#begun = true
    return further
  }

  /** Reads records until the batch is full (false) or more bytes are needed (true). */
  read(out: BatchBuilder): boolean {
    if (!this.#begun && !this.#begin()) return true
    while (this.#start < this.#end) {
      if (this.#skipping && !this.#skip(out)) return true
      const after = this.#reader.read(this.#bytes, this.#start, this.#end, this.#final, out)
      this.#advance(after)
      if (this.#reader.failure !== null) {
        this.failure = this.#reader.failure
        return true
      }
      if (out.full) return false
      if (this.#end - this.#start <= this.#limit) return true
      out.nextRecord()
      out.refuse('too-long', tooLong(this.#limit), this.#bytes, this.#start, this.#end)
      this.#skipping = true
    }
    return true
  }

  #advance(to: number): void {
    this.#offset += to - this.#start
    this.#start = to
  }

  /** Looks for a byte order mark; false when too few bytes are here to tell. */
  #begin(): boolean {
    const held = this.#end - this.#start
    if (held < 3 && !this.#final) return false
    this.#begun = true
    const [first, second] = this.#bytes.subarray(this.#start, this.#end)
    if ((first === 0xff && second === 0xfe) || (first === 0xfe && second === 0xff)) {
      this.failure = new TautlineError('feed-encoding', 'The text is UTF-16.')
      return false
    }
    this.#advance(afterMark(this.#bytes, this.#start, this.#end))
    return true
  }

  /** Skips to the end of the line; false when it is not here yet. */
  #skip(out: BatchBuilder): boolean {
    const feed = this.#bytes.indexOf(lineFeed, this.#start)
    if (feed < 0 || feed >= this.#end) {
      this.#advance(this.#end)
      return false
    }
    this.#advance(feed + 1)
    this.#skipping = false
    out.line++
    return true
  }
}
