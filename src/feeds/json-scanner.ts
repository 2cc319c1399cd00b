import { NumberScanner } from './decimal.ts'
import type { TimeRule } from './json-reader.ts'
import type { NameTable } from './name-table.ts'
import { epochNumber, readRfc3339 } from './times.ts'

const other = 3
const mostMembers = 32
const plainKey = /^[\u0020\u0021\u0023-\u005b\u005d-\u007e]+$/

const words = ['true', 'false', 'null'].map((word) => Buffer.from(word, 'latin1'))

/**
 * The fast way through records such as `{"signal":"QUAY","time":1793520000000,"value":101.25}`: one object in
 * one line, the three members in any order among members with scalar values. What it reads, it reads as
 * `JSON.parse` and `JsonReader` would; at anything else (escapes, nesting, a name not yet known, a member
 * twice, a time out of range, a fault) it gives up, and the caller takes the slow way.
 */
export class JsonScanner {
  signal = 0
  time = 0
  value = 0
  readonly #names: NameTable
  readonly #rule: TimeRule
  /** Bytes of the three keys, each with its closing quotation mark. */
  readonly #keys: readonly Uint8Array[]
  /** Which member stood in which place of the record before; most records are alike. */
  readonly #order = new Uint8Array(mostMembers).fill(other)
  readonly #number = new NumberScanner()

  private constructor(keys: readonly string[], rule: TimeRule, names: NameTable) {
    this.#keys = keys.map((key) => Buffer.from(`${key}"`, 'latin1'))
    this.#rule = rule
    this.#names = names
  }

  /** A scanner for members of these names, or null where the names do not allow of one. */
  static for(
    signal: string,
    time: string,
    value: string,
    rule: TimeRule,
    names: NameTable,
  ): JsonScanner | null {
    const keys = [signal, time, value]
    if (!keys.every((key) => plainKey.test(key)) || new Set(keys).size < 3) return null
    return new JsonScanner(keys, rule, names)
  }

  /**
   * Reads the record at `bytes[at]` and gives the position after its line feed, or -1. A line feed must
   * follow somewhere. Sets `signal`, `time` and `value` only when it succeeds.
   */
  scan(bytes: Uint8Array, at: number): number {
    if (bytes[at] !== 123) return -1
    let p = at + 1
    let seen = 0
    let signal = 0
    let time = 0
    let value = 0
    for (let place = 0; ; place++) {
      let c = bytes[p]!
      while (c === 32 || c === 9) c = bytes[++p]!
      if (c !== 34 || place === mostMembers) return -1
      const key = this.#key(bytes, p + 1, place)
      if (key < 0) return -1
      const member = this.#order[place]!
      p = key
      c = bytes[p]!
      while (c === 32 || c === 9) c = bytes[++p]!
      if (c !== 58) return -1
      c = bytes[++p]!
      while (c === 32 || c === 9) c = bytes[++p]!
      if (member === other) {
        p = this.#skip(bytes, p)
        if (p < 0) return -1
      } else {
        const bit = 1 << member
        if ((seen & bit) !== 0) return -1
        seen |= bit
        if (member === 0) {
          if (c !== 34) return -1
          const start = ++p
          let hash = 0
          c = bytes[p]!
          while (c !== 34) {
            if (c < 32 || c === 92) return -1
            hash = (Math.imul(hash, 31) + c) | 0
            c = bytes[++p]!
          }
          signal = this.#names.findHashed(bytes, start, p, hash)
          if (signal < 0) return -1
          p++
        } else if (member === 1) {
          p = this.#time(bytes, p)
          if (p < 0) return -1
          time = this.time
        } else {
          p = this.#number.scan(bytes, p)
          if (p < 0) return -1
          value = this.#number.value
          if (!Number.isFinite(value)) return -1
        }
      }
      c = bytes[p]!
      while (c === 32 || c === 9) c = bytes[++p]!
      p++
      if (c === 44) continue
      if (c !== 125) return -1
      break
    }
    let c = bytes[p]!
    while (c === 32 || c === 9 || c === 13) c = bytes[++p]!
    if (c !== 10 || seen !== 7) return -1
    this.signal = signal
    this.time = time
    this.value = value
    return p + 1
  }

  /** Position after the key's closing quotation mark, or -1; notes in `#order` which member it is. */
  #key(bytes: Uint8Array, at: number, place: number): number {
    const likely = this.#order[place]!
    if (likely !== other) {
      const after = this.#match(bytes, at, this.#keys[likely]!)
      if (after > 0) return after
    }
    for (let member = 0; member < other; member++) {
      const after = this.#match(bytes, at, this.#keys[member]!)
      if (after > 0) {
        this.#order[place] = member
        return after
      }
    }
    this.#order[place] = other
    return endOfText(bytes, at)
  }

  #match(bytes: Uint8Array, at: number, key: Uint8Array): number {
    const length = key.length
    for (let i = 0; i < length; i++) if (bytes[at + i] !== key[i]) return -1
    return at + length
  }

  /** Reads the time at `at` into `time`; gives the position after it, or -1. */
  #time(bytes: Uint8Array, at: number): number {
    if (bytes[at] === 34) {
      if (this.#rule.text !== 'rfc3339') return -1
      const after = endOfText(bytes, at + 1)
      if (after < 0) return -1
      this.time = readRfc3339(bytes, at + 1, after - 1)
      return Number.isNaN(this.time) ? -1 : after
    }
    if (this.#rule.number === null) return -1
    const after = this.#number.scan(bytes, at)
    if (after < 0) return -1
    this.time = epochNumber(this.#number.value, this.#rule.number)
    return Number.isNaN(this.time) ? -1 : after
  }

  /** Position after the scalar at `at`, or -1. */
  #skip(bytes: Uint8Array, at: number): number {
    if (bytes[at] === 34) return endOfText(bytes, at + 1)
    for (const word of words) {
      const after = this.#match(bytes, at, word)
      if (after > 0) return after
    }
    return this.#number.scan(bytes, at)
  }
}

/** Position after the closing quotation mark of a text without escapes, or -1. */
function endOfText(bytes: Uint8Array, at: number): number {
  let p = at
  let c = bytes[p]!
  while (c !== 34) {
    if (c < 32 || c === 92) return -1
    c = bytes[++p]!
  }
  return p + 1
}
