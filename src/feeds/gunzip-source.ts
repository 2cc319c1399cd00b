import { createGunzip, type Gunzip } from 'node:zlib'
import { type ByteSource, PrefixedSource, skipByReading } from './byte-source.ts'

/** Compressed bytes given to zlib at once: what they become waits in memory, at most about 1,030 times as much. */
const pieceSize = 16 * 1024

/**
 * Bytes of a gzip stream (RFC 1952), of any number of members. Where it is damaged or cut off, all that
 * zlib gave before is given, then `damage` says what is wrong; of a piece that turns out damaged at most the
 * last `outputSize` bytes before the damage are lost. zlib may take damaged bytes for good ones until it comes
 * to the checksum at the end: what was read of a damaged member is not to be relied on.
 */
export class GunzipSource implements ByteSource {
  readonly #inner: ByteSource
  readonly #gunzip: Gunzip
  readonly #piece = Buffer.allocUnsafe(pieceSize)
  readonly #ready: Buffer[] = []
  #ended = false
  #damage: string | null = null
  /** Called when zlib has failed or has come to its end. */
  #wake = () => {}

  constructor(inner: ByteSource, outputSize: number) {
    this.#inner = inner
    this.#gunzip = createGunzip({ chunkSize: outputSize })
    this.#gunzip.on('data', (data: Buffer) => this.#ready.push(data))
    this.#gunzip.on('error', (error) => this.#end(damageOf(error)))
    this.#gunzip.on('end', () => this.#end(null))
  }

  get waiting(): boolean | null {
    return this.#ready.length > 0 ? true : this.#inner.waiting
  }

  get damage(): string | null {
    return this.#ready.length > 0 ? null : this.#damage
  }

  async read(into: Buffer, at: number, length: number): Promise<number> {
    while (this.#ready.length === 0 && !this.#ended) await this.#inflate()
    const first = this.#ready[0]
    if (first === undefined) return 0
    const copied = first.copy(into, at, 0, length)
    if (copied === first.length) this.#ready.shift()
    else this.#ready[0] = first.subarray(copied)
    return copied
  }

  skip(count: number): Promise<number> {
    return skipByReading(this, count)
  }

  behind(): number | null {
    return this.#inner.behind()
  }

  async close(): Promise<void> {
    this.#gunzip.destroy()
    await this.#inner.close()
  }

  async #inflate(): Promise<void> {
    const length = await this.#inner.read(this.#piece, 0, pieceSize)
    await new Promise<void>((resolve) => {
      this.#wake = resolve
      if (this.#ended) resolve()
      else if (length === 0) this.#gunzip.end()
      else this.#gunzip.write(this.#piece.subarray(0, length), () => resolve())
    })
  }

  #end(damage: string | null): void {
    this.#ended = true
    this.#damage ??= damage
    this.#wake()
  }
}

const damageOf = (error: Error & { code?: string }): string =>
  error.code === 'Z_BUF_ERROR'
    ? 'the compressed data end too early; all before this was read'
    : `the compressed data are damaged (${error.message}); readings taken before this was noticed may be wrong`

/** Output piece of zlib, the less the smaller the file, so that damage costs little: 512 bytes to 64 KiB. */
const outputSizeFor = (compressed: number | null): number =>
  compressed === null
    ? 16 * 1024
    : Math.min(64 * 1024, Math.max(512, 2 ** Math.floor(Math.log2(compressed / 16 + 1))))

/** The text of a source: decompressed where it begins as gzip does, whatever it is called. */
export async function textOf(source: ByteSource): Promise<{ text: ByteSource; gzip: boolean }> {
  const first = Buffer.allocUnsafe(2)
  let held = 0
  while (held < 2) {
    const length = await source.read(first, held, 2 - held)
    if (length === 0) break
    held += length
  }
  const whole = new PrefixedSource(first.subarray(0, held), source)
  const gzip = held === 2 && first[0] === 0x1f && first[1] === 0x8b
  return { text: gzip ? new GunzipSource(whole, outputSizeFor(whole.behind())) : whole, gzip }
}
