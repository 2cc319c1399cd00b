import { utf8 } from './decimal.ts'

export const incomplete = -1

/**
 * Cuts one row of CSV (RFC 4180) into its cells: commas, rows ended by LF or CRLF, cells that begin with a
 * quotation mark may hold commas, line ends and doubled quotation marks. Blanks around a cell that is not
 * quoted do not count. Reused row by row.
 */
export class CsvRow {
  /** Cells of the row, also of those beyond the room for their places. */
  cells = 0
  /** Line feeds within the row, its own end included. */
  lines = 0
  /** Why the row cannot be read, or null. */
  fault: string | null = null
  /** Cell i is `bytes[starts[i], ends[i])`, without quotation marks. */
  starts: Int32Array
  ends: Int32Array
  /** 1 for quoted, 2 for quoted with doubled quotation marks inside. */
  quoted: Uint8Array
  readonly #limit: number

  /** `room`: so many cells have their places kept; `limit`: longest row in bytes. */
  constructor(room: number, limit: number) {
    this.starts = new Int32Array(room)
    this.ends = new Int32Array(room)
    this.quoted = new Uint8Array(room)
    this.#limit = limit
  }

  /**
   * Cuts the row at `bytes[from]`; gives the position after it, or `incomplete` when it does not end before
   * `to` or is longer than the limit.
   */
  cut(bytes: Buffer, from: number, to: number): number {
    const end = Math.min(to, from + this.#limit + 1)
    const last = bytes.lastIndexOf(10, end - 1)
    const room = this.starts.length
    this.lines = 1
    this.fault = null
    let cell = 0
    let p = from
    for (;;) {
      if (p > last) return incomplete
      let start = p
      let stop: number
      let mark = 0
      if (bytes[p] === 34) {
        start = p + 1
        stop = this.#closing(bytes, start, end)
        if (stop < 0) return incomplete
        mark = this.#doubled ? 2 : 1
        p = stop + 1
        if (p > last) return incomplete
        const c = bytes[p]
        if (c !== 44 && c !== 10 && !(c === 13 && bytes[p + 1] === 10)) {
          this.fault = 'Text follows a closing quotation mark.'
        }
        while (bytes[p] !== 44 && bytes[p] !== 10) p++
      } else {
        let c = bytes[p]!
        while (c !== 44 && c !== 10) c = bytes[++p]!
        stop = p
        while (start < stop && isBlank(bytes[start]!)) start++
        while (stop > start && isBlank(bytes[stop - 1]!)) stop--
      }
      if (cell < room) {
        this.starts[cell] = start
        this.ends[cell] = stop
        this.quoted[cell] = mark
      }
      cell++
      if (bytes[p++] === 10) break
    }
    this.cells = cell
    return p
  }

  #doubled = false

  /** Position of the quotation mark that closes the cell, or -1. */
  #closing(bytes: Buffer, from: number, to: number): number {
    this.#doubled = false
    let p = from
    while (p < to) {
      const c = bytes[p]
      if (c === 10) this.lines++
      else if (c === 34) {
        if (p + 1 >= to) return -1
        if (bytes[p + 1] !== 34) return p
        this.#doubled = true
        p++
      }
      p++
    }
    return -1
  }

  text(bytes: Buffer, cell: number): string {
    const text = utf8(bytes, this.starts[cell]!, this.ends[cell]!)
    return this.quoted[cell] === 2 ? text.replaceAll('""', '"') : text
  }
}

/** Blank, tab, or the CR of CRLF. */
const isBlank = (c: number): boolean => c === 32 || c === 9 || c === 13
