import type { BatchBuilder } from './batch-builder.ts'
import type { JsonScanner } from './json-scanner.ts'
import { afterMark, type DocumentReader, lineFeed, type RecordReader, tooLong } from './record-reader.ts'

export interface LineReaderOptions {
  /** Longest record in bytes. */
  readonly limit: number
  readonly document: DocumentReader
  /** Tried first on every record; null: every record goes to `document`. */
  readonly scanner: JsonScanner | null
  /** Whether a message is made of lines too; else it is one document. */
  readonly linesInMessages: boolean
}

/** Records of one line each: every format that is JSON. Blank lines are no records. */
export class LineReader implements RecordReader {
  readonly failure = null
  readonly #limit: number
  readonly #document: DocumentReader
  readonly #scanner: JsonScanner | null
  readonly #linesInMessages: boolean

  constructor(options: LineReaderOptions) {
    this.#limit = options.limit
    this.#document = options.document
    this.#scanner = options.scanner
    this.#linesInMessages = options.linesInMessages
  }

  read(bytes: Buffer, from: number, to: number, _final: boolean, out: BatchBuilder): number {
    if (to <= from) return from
    const end = bytes.lastIndexOf(lineFeed, to - 1) + 1
    const scanner = this.#scanner
    const limit = this.#limit
    let p = from
    while (p < end) {
      const after = scanner === null ? -1 : scanner.scan(bytes, p)
      if (after > 0 && after - p <= limit + 1) {
        out.add(scanner!.signal, scanner!.time, scanner!.value)
        p = after
      } else {
        const feed = bytes.indexOf(lineFeed, p)
        this.#slow(bytes, p, feed, out)
        p = feed + 1
      }
      out.line++
      if (out.full) break
    }
    return p
  }

  message(bytes: Buffer, from: number, to: number, out: BatchBuilder): void {
    let p = afterMark(bytes, from, to)
    if (this.#linesInMessages) {
      while (p <= to) p = this.read(bytes, p, to + 1, true, out)
      return
    }
    const scanner = this.#scanner
    if (scanner !== null && to - p <= this.#limit && scanner.scan(bytes, p) === to + 1)
      out.add(scanner.signal, scanner.time, scanner.value)
    else this.#slow(bytes, p, to, out)
  }

  #slow(bytes: Buffer, from: number, to: number, out: BatchBuilder): void {
    if (to - from > this.#limit) {
      out.nextRecord()
      out.refuse('too-long', tooLong(this.#limit), bytes, from, to)
    } else if (!isBlank(bytes, from, to)) {
      out.nextRecord()
      this.#document(bytes, from, to, out)
    }
  }
}

function isBlank(bytes: Buffer, from: number, to: number): boolean {
  for (let p = from; p < to; p++) {
    const c = bytes[p]
    if (c !== 32 && c !== 13 && c !== 9) return false
  }
  return true
}
