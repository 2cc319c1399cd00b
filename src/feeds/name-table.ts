import { isUtf8 } from 'node:buffer'

export const longestName = 200
export const mostNames = 20_000

/** Why a name was not taken in. */
export const badName = -2
export const tooManyNames = -3

const control = /[\u0000-\u001f\u007f-\u009f]/

/**
 * The names of a feed's signals, each with a whole number from 0 in order of first appearance. Looked up by
 * their UTF-8 bytes, so that the fast readers need no string.
 */
export class NameTable {
  /** Only grows; shared by all batches of a feed. */
  readonly names: string[] = []
  readonly #limit: number
  /** Open addressing with linear probing; -1 marks a free place. */
  #places = new Int32Array(1024).fill(-1)
  #hashes = new Int32Array(512)
  /** Name i is `#bytes[#starts[i] .. #starts[i + 1])`. */
  #starts = new Int32Array(513)
  #bytes = new Uint8Array(8192)

  constructor(limit = mostNames) {
    this.#limit = limit
  }

  /** The number of the name in `bytes[from, to)`, or -1 when it is not known. */
  find(bytes: Uint8Array, from: number, to: number): number {
    let hash = 0
    for (let i = from; i < to; i++) hash = (Math.imul(hash, 31) + bytes[i]!) | 0
    return this.findHashed(bytes, from, to, hash)
  }

  /** As `find`, with h = 31 h + byte over the name, as a 32-bit integer, already computed. */
  findHashed(bytes: Uint8Array, from: number, to: number, hash: number): number {
    const places = this.#places
    const mask = places.length - 1
    const length = to - from
    for (let place = spread(hash) & mask; ; place = (place + 1) & mask) {
      const index = places[place]!
      if (index < 0) return -1
      if (this.#hashes[index] !== hash) continue
      const start = this.#starts[index]!
      if (this.#starts[index + 1]! - start !== length) continue
      const own = this.#bytes
      let same = 0
      while (same < length && own[start + same] === bytes[from + same]) same++
      if (same === length) return index
    }
  }

  /**
   * As `find`, but takes a new name in. `badName`: empty, longer than 200 UTF-16 units, with control
   * characters, or no well-formed Unicode (U+FFFD stands for what was lost and is refused with it);
   * `tooManyNames`: the table is full.
   */
  intern(bytes: Uint8Array, from: number, to: number): number {
    const known = this.find(bytes, from, to)
    if (known >= 0) return known
    const part = bytes.subarray(from, to)
    // A UTF-16 unit takes at most 3 bytes of UTF-8.
    if (part.length === 0 || part.length > 3 * longestName || !isUtf8(part)) return badName
    const name = Buffer.from(part.buffer, part.byteOffset, part.length).toString('utf8')
    if (name.length > longestName || name.includes('\ufffd') || control.test(name)) return badName
    if (this.names.length >= this.#limit) return tooManyNames
    return this.#add(name, part)
  }

  /** As `intern`, of a string. */
  internText(name: string): number {
    if (name.length > longestName) return badName
    const bytes = Buffer.from(name, 'utf8')
    return this.intern(bytes, 0, bytes.length)
  }

  #add(name: string, part: Uint8Array): number {
    const index = this.names.length
    if (index + 1 >= this.#hashes.length) this.#grow()
    const start = this.#starts[index]!
    if (start + part.length > this.#bytes.length) {
      const larger = new Uint8Array(2 * this.#bytes.length + part.length)
      larger.set(this.#bytes)
      this.#bytes = larger
    }
    this.#bytes.set(part, start)
    this.#starts[index + 1] = start + part.length
    let hash = 0
    for (const byte of part) hash = (Math.imul(hash, 31) + byte) | 0
    this.#hashes[index] = hash
    this.#put(index)
    this.names.push(name)
    return index
  }

  #put(index: number): void {
    const mask = this.#places.length - 1
    let place = spread(this.#hashes[index]!) & mask
    while (this.#places[place]! >= 0) place = (place + 1) & mask
    this.#places[place] = index
  }

  #grow(): void {
    const hashes = new Int32Array(2 * this.#hashes.length)
    hashes.set(this.#hashes)
    this.#hashes = hashes
    const starts = new Int32Array(2 * this.#hashes.length + 1)
    starts.set(this.#starts)
    this.#starts = starts
    this.#places = new Int32Array(4 * this.#hashes.length).fill(-1)
    for (let index = 0; index < this.names.length; index++) this.#put(index)
  }
}

/** Brings the high bits, which the last bytes of a name hardly reach, down to where the mask looks. */
const spread = (hash: number): number => Math.imul(hash, 0x9e3779b1) >>> 12
