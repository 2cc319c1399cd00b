import { type FileHandle, open } from 'node:fs/promises'
import type { Readable } from 'node:stream'
import { TautlineError } from '../errors.ts'

/** Bytes that are asked for piece by piece: nothing is read before it is wanted. */
export interface ByteSource {
  /** Reads up to `length` bytes into `into` at `at`; gives how many, 0 at the end. */
  read(into: Buffer, at: number, length: number): Promise<number>
  /** Leaves out bytes; gives how many there were to leave out. */
  skip(count: number): Promise<number>
  /** Bytes still to come, when known. */
  behind(): number | null
  /** Whether bytes are here that can be read without waiting; null when that is not known. */
  readonly waiting: boolean | null
  /** What is wrong with the bytes, once `read` has given all that could be read; null while nothing is. */
  readonly damage: string | null
  close(): Promise<void>
}

/** Leaves out bytes by reading them. */
export async function skipByReading(source: ByteSource, count: number): Promise<number> {
  const scrap = Buffer.allocUnsafe(Math.min(count, 64 * 1024))
  let left = count
  while (left > 0) {
    const length = await source.read(scrap, 0, Math.min(left, scrap.length))
    if (length === 0) break
    left -= length
  }
  return count - left
}

const reasonOf = (error: unknown): string => (error instanceof Error ? error.message : String(error))

const pieceBytes = 256 * 1024

/** A piece of a file that was asked for: its bytes, or why they could not be read. */
interface Piece {
  readonly buffer: Buffer
  readonly length: number
  readonly fault: unknown
}

/**
 * A file on disk, as long as it was when it was opened. One piece is read ahead, so that the disk works while
 * the last piece is looked at.
 */
export class FileSource implements ByteSource {
  readonly waiting = null
  readonly damage = null
  readonly size: number
  readonly #path: string
  readonly #handle: FileHandle
  /** Place in the file of the next byte that `read` gives. */
  #position = 0
  #piece: Piece = { buffer: Buffer.alloc(0), length: 0, fault: null }
  /** Bytes of the piece that were given. */
  #given = 0
  #ahead: Promise<Piece> | null = null
  #spare: Buffer | null = null

  private constructor(path: string, handle: FileHandle, size: number) {
    this.#path = path
    this.#handle = handle
    this.size = size
  }

  /** Raises `feed-file` when there is no such file, it is a folder, or it may not be read. */
  static async open(path: string): Promise<FileSource> {
    try {
      const handle = await open(path, 'r')
      try {
        const stat = await handle.stat()
        if (stat.isDirectory()) throw new Error(`${path} is a folder`)
        return new FileSource(path, handle, stat.size)
      } catch (error) {
        await handle.close()
        throw error
      }
    } catch (error) {
      throw new TautlineError('feed-file', `${reasonOf(error)}.`, { cause: error })
    }
  }

  async read(into: Buffer, at: number, length: number): Promise<number> {
    if (this.#given === this.#piece.length) {
      const spent = this.#piece.buffer
      const piece = await (this.#ahead ?? this.#fetch(this.#position))
      this.#ahead = null
      if (piece.fault !== null) {
        throw new TautlineError('feed-file', `${this.#path}: ${reasonOf(piece.fault)}.`, {
          cause: piece.fault,
        })
      }
      this.#piece = piece
      this.#given = 0
      this.#spare = spent.length === pieceBytes ? spent : null
      if (piece.length > 0) this.#ahead = this.#fetch(this.#position + piece.length)
    }
    const count = this.#piece.buffer.copy(
      into,
      at,
      this.#given,
      Math.min(this.#piece.length, this.#given + length),
    )
    this.#given += count
    this.#position += count
    return count
  }

  async skip(count: number): Promise<number> {
    const skipped = Math.max(0, Math.min(count, this.size - this.#position))
    this.#position += skipped
    const within = this.#given + skipped <= this.#piece.length
    if (within) this.#given += skipped
    else {
      await this.#ahead
      this.#ahead = null
      this.#given = this.#piece.length
    }
    return skipped
  }

  async #fetch(position: number): Promise<Piece> {
    const buffer = this.#spare ?? Buffer.allocUnsafe(pieceBytes)
    this.#spare = null
    try {
      const { bytesRead } = await this.#handle.read(buffer, 0, pieceBytes, position)
      return { buffer, length: bytesRead, fault: null }
    } catch (fault) {
      return { buffer, length: 0, fault }
    }
  }

  behind(): number {
    return Math.max(0, this.size - this.#position)
  }

  async close(): Promise<void> {
    await this.#ahead
    await this.#handle.close()
  }
}

/** A stream such as standard input; it is read only as fast as it is asked. */
export class StreamSource implements ByteSource {
  readonly damage = null
  readonly #stream: Readable
  readonly #pieces: AsyncIterator<Buffer | string>
  #rest: Buffer = Buffer.alloc(0)

  constructor(stream: Readable) {
    this.#stream = stream
    this.#pieces = stream[Symbol.asyncIterator]()
  }

  get waiting(): boolean {
    return this.#rest.length > 0 || this.#stream.readableLength > 0
  }

  async read(into: Buffer, at: number, length: number): Promise<number> {
    while (this.#rest.length === 0) {
      try {
        const { done, value } = await this.#pieces.next()
        if (done) return 0
        this.#rest = typeof value === 'string' ? Buffer.from(value) : value
      } catch (error) {
        throw new TautlineError('feed-file', `The stream broke off: ${reasonOf(error)}.`, { cause: error })
      }
    }
    const copied = this.#rest.copy(into, at, 0, length)
    this.#rest = this.#rest.subarray(copied)
    return copied
  }

  skip(count: number): Promise<number> {
    return skipByReading(this, count)
  }

  behind(): null {
    return null
  }

  async close(): Promise<void> {
    this.#stream.destroy()
  }
}

/** Bytes already read, put back before the rest. */
export class PrefixedSource implements ByteSource {
  readonly #inner: ByteSource
  #prefix: Buffer

  constructor(prefix: Buffer, inner: ByteSource) {
    this.#prefix = prefix
    this.#inner = inner
  }

  get waiting(): boolean | null {
    return this.#prefix.length > 0 ? true : this.#inner.waiting
  }

  get damage(): string | null {
    return this.#inner.damage
  }

  async read(into: Buffer, at: number, length: number): Promise<number> {
    if (this.#prefix.length === 0) return this.#inner.read(into, at, length)
    const copied = this.#prefix.copy(into, at, 0, length)
    this.#prefix = this.#prefix.subarray(copied)
    return copied
  }

  async skip(count: number): Promise<number> {
    const first = Math.min(count, this.#prefix.length)
    this.#prefix = this.#prefix.subarray(first)
    return first + (count > first ? await this.#inner.skip(count - first) : 0)
  }

  behind(): number | null {
    const behind = this.#inner.behind()
    return behind === null ? null : behind + this.#prefix.length
  }

  close(): Promise<void> {
    return this.#inner.close()
  }
}
