import { TautlineError } from '../errors.ts'
import type { BatchBuilder } from './batch-builder.ts'
import { type CsvFormat, type CsvHeader, headerFault } from './csv-header.ts'
import { CsvRow, incomplete } from './csv-row.ts'
import { NumberScanner, readDecimal } from './decimal.ts'
import { afterMark, lineFeed, type RecordReader, tooLong } from './record-reader.ts'
import { readTime } from './times.ts'

const badTime = 'the cell of the time column is no time of the years 1900 to 2200 in the unit stated'
const badValue = 'a cell is no finite decimal number'

/**
 * CSV (RFC 4180) with a header line: `long`, one reading a row; `wide`, one column a signal, where an empty
 * cell or `NA` is no reading. Columns not named in the settings do not matter in `long`. In a message, every
 * message has its own header.
 */
export class CsvReader implements RecordReader {
  failure: TautlineError | null = null
  readonly #format: CsvFormat
  readonly #limit: number
  #header: CsvHeader | null = null
  #row: CsvRow
  readonly #number = new NumberScanner()

  constructor(format: CsvFormat, limit: number) {
    this.#format = format
    this.#limit = limit
    this.#row = new CsvRow(64, limit)
  }

  read(bytes: Buffer, from: number, to: number, final: boolean, out: BatchBuilder): number {
    let p = from
    while (p < to) {
      const after = this.#row.cut(bytes, p, to)
      if (after !== incomplete) {
        out.nextRecord()
        this.#take(bytes, p, after, out)
        if (this.failure !== null) return p
        out.line += this.#row.lines
        p = after
      } else if (!final && to - p <= this.#limit) break
      else {
        const feed = bytes.indexOf(lineFeed, p)
        if (feed < 0 || feed >= to) break
        out.nextRecord()
        if (feed - p > this.#limit) out.refuse('too-long', tooLong(this.#limit), bytes, p, feed)
        else out.refuse('unreadable', 'a quoted cell is not closed', bytes, p, feed)
        out.line++
        p = feed + 1
      }
      if (out.full) break
    }
    return p
  }

  message(bytes: Buffer, from: number, to: number, out: BatchBuilder): void {
    this.#header = null
    let p = afterMark(bytes, from, to)
    while (p <= to && this.failure === null) p = this.read(bytes, p, to + 1, true, out)
    if (this.failure === null) return
    out.refuse('unreadable', this.failure.detail, bytes, from, to)
    this.failure = null
  }

  #take(bytes: Buffer, from: number, after: number, out: BatchBuilder): void {
    const row = this.#row
    const header = this.#header
    if (row.cells === 1 && row.quoted[0] === 0 && row.ends[0] === row.starts[0]) return
    const refuse = (detail: string): void => out.refuse('unreadable', detail, bytes, from, after - 1)
    if (header === null) this.#readHeader(bytes, from, after, out)
    else if (row.fault !== null) refuse(row.fault)
    else if (row.cells !== header.columns)
      refuse(`the row has ${row.cells} cells, the header ${header.columns}`)
    else {
      const time = this.#time(bytes, header.time)
      if (Number.isNaN(time)) out.refuse('bad-time', badTime, bytes, from, after - 1)
      else if (this.#format.csv === 'wide') this.#takeWide(bytes, from, after, header, time, out)
      else this.#takeLong(bytes, from, after, header, time, out)
    }
  }

  #takeWide(
    bytes: Buffer,
    from: number,
    after: number,
    header: CsvHeader,
    time: number,
    out: BatchBuilder,
  ): void {
    const { starts, ends } = this.#row
    const { signals, columns } = header
    const number = this.#number
    for (let cell = 0; cell < columns; cell++) {
      const signal = signals[cell]!
      if (signal < 0) continue
      const start = starts[cell]!
      const end = ends[cell]!
      if (start === end) continue
      if (number.scan(bytes, start) === end && Number.isFinite(number.value)) {
        out.add(signal, time, number.value)
        continue
      }
      if (end - start === 2 && bytes[start] === 78 && bytes[start + 1] === 65) continue
      const value = readDecimal(this.#row.text(bytes, cell))
      if (Number.isFinite(value)) out.add(signal, time, value)
      else out.refuse('bad-value', badValue, bytes, from, after - 1)
    }
  }

  #takeLong(
    bytes: Buffer,
    from: number,
    after: number,
    header: CsvHeader,
    time: number,
    out: BatchBuilder,
  ): void {
    const { starts, ends, quoted } = this.#row
    const start = starts[header.value]!
    const end = ends[header.value]!
    const plain = start < end && this.#number.scan(bytes, start) === end
    const value = plain ? this.#number.value : readDecimal(this.#row.text(bytes, header.value))
    if (!Number.isFinite(value)) {
      out.refuse('bad-value', badValue, bytes, from, after - 1)
      return
    }
    const cell = header.signal
    const signal =
      quoted[cell] === 2
        ? out.names.internText(this.#row.text(bytes, cell))
        : out.names.intern(bytes, starts[cell]!, ends[cell]!)
    if (signal < 0) out.refuseName(signal, bytes, from, after - 1)
    else out.add(signal, time, value)
  }

  #time(bytes: Buffer, cell: number): number {
    const { starts, ends } = this.#row
    return readTime(bytes, starts[cell]!, ends[cell]!, this.#format.unit)
  }

  #readHeader(bytes: Buffer, from: number, after: number, out: BatchBuilder): void {
    const columns = this.#row.cells
    if (columns > this.#row.starts.length) {
      this.#row = new CsvRow(columns, this.#limit)
      this.#row.cut(bytes, from, after)
    }
    const names = Array.from({ length: columns }, (_, cell) => this.#row.text(bytes, cell))
    const format = this.#format
    const fault = this.#row.fault ?? headerFault(names, format)
    if (fault !== null) {
      this.failure = new TautlineError('feed-columns', fault)
      return
    }
    const signals = new Int32Array(columns).fill(-1)
    if (format.csv === 'wide')
      for (const [cell, name] of names.entries()) {
        if (name === format.time) continue
        const signal = out.names.internText(name)
        if (signal < 0) out.refuseName(signal, bytes, from, after - 1)
        else signals[cell] = signal
      }
    this.#header = {
      columns,
      time: names.indexOf(format.time),
      signal: format.csv === 'long' ? names.indexOf(format.signal) : -1,
      value: format.csv === 'long' ? names.indexOf(format.value) : -1,
      signals,
    }
  }
}
