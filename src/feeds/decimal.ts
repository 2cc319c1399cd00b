/** Powers of ten that a double holds exactly: 10^22 < 2^53 · 5^22's reach (Clinger 1990, from memory). */
const powers = Float64Array.from({ length: 23 }, (_, i) => Number(`1e${i}`))
const exactBelow = 2 ** 53
const jsonNumber = /^-?(?:0|[1-9][0-9]*)(?:\.[0-9]+)?(?:[eE][+-]?[0-9]+)?$/

/**
 * Reads JSON numbers (RFC 8259, section 6) from bytes, each to the double nearest to it, as `JSON.parse`
 * does. Digits below 2^53 over a power of ten up to 10^22 are one exact division of two exact doubles
 * (Clinger 1990, "How to read floating point numbers accurately", from memory); all else goes through `Number`.
 */
export class NumberScanner {
  /** The number that the last successful `scan` read. */
  value = 0

  /**
   * Reads the number that begins at `bytes[at]`; gives the position after it, or -1 when there is none.
   * Needs a byte that belongs to no number at or after the end.
   */
  scan(bytes: Uint8Array, at: number): number {
    let p = at
    let c = bytes[p]!
    const negative = c === 45
    if (negative) c = bytes[++p]!
    let digit = c - 48
    if (digit < 0 || digit > 9) return -1
    let digits = digit
    digit = bytes[++p]! - 48
    if (digits === 0) {
      if (digit >= 0 && digit <= 9) return -1
    } else
      while (digit >= 0 && digit <= 9) {
        digits = digits * 10 + digit
        digit = bytes[++p]! - 48
      }
    let places = 0
    if (digit === -2) {
      const point = p
      digit = bytes[++p]! - 48
      while (digit >= 0 && digit <= 9) {
        digits = digits * 10 + digit
        digit = bytes[++p]! - 48
      }
      places = p - point - 1
      if (places === 0) return -1
    }
    c = digit + 48
    if (c === 101 || c === 69 || digits >= exactBelow || places > 22) return this.#slow(bytes, at, p)
    const magnitude = places === 0 ? digits : digits / powers[places]!
    this.value = negative ? -magnitude : magnitude
    return p
  }

  #slow(bytes: Uint8Array, at: number, from: number): number {
    let p = from
    if (bytes[p] === 101 || bytes[p] === 69) {
      p++
      if (bytes[p] === 43 || bytes[p] === 45) p++
      while (bytes[p]! >= 48 && bytes[p]! <= 57) p++
    }
    const text = latin1(bytes, at, p)
    if (!jsonNumber.test(text)) return -1
    this.value = Number(text)
    return p
  }
}

const decimal = /^[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?$/

/**
 * The number that a text of a CSV cell states: decimal digits with an optional sign, point and exponent, blanks
 * around it ignored. NaN for all else, also for `NaN`, `Infinity`, hexadecimal and digits in groups.
 */
export function readDecimal(text: string): number {
  const bare = text.trim()
  return decimal.test(bare) ? Number(bare) : Number.NaN
}

export const latin1 = (bytes: Uint8Array, from: number, to: number): string =>
  Buffer.from(bytes.buffer, bytes.byteOffset + from, Math.max(0, to - from)).toString('latin1')

export const utf8 = (bytes: Uint8Array, from: number, to: number): string =>
  Buffer.from(bytes.buffer, bytes.byteOffset + from, Math.max(0, to - from)).toString('utf8')
