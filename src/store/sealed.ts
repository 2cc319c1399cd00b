import { deserialize, serialize } from 'node:v8'
import { crc32 } from 'node:zlib'
import { TautlineError } from '../errors.ts'

/** Grows when the layout of the sealed bytes changes; what is inside has a version of its own. */
const formatVersion = 1
const headerBytes = 9

/**
 * Any structured-clone-able value as bytes: format version (1 byte), length of the body (4), CRC-32 of the
 * body (4, ISO 3309), both big-endian, and the body as `node:v8` serializes it.
 */
export function seal(value: unknown): Uint8Array {
  const body = serialize(value)
  const sealed = Buffer.allocUnsafe(headerBytes + body.length)
  sealed.writeUInt8(formatVersion, 0)
  sealed.writeUInt32BE(body.length, 1)
  sealed.writeUInt32BE(crc32(body), 5)
  body.copy(sealed, headerBytes)
  return sealed
}

/** The value that `seal` was given. Throws `checkpoint-unreadable` for another format or changed bytes. */
export function unseal(bytes: Uint8Array): unknown {
  const sealed = Buffer.from(bytes.buffer, bytes.byteOffset, bytes.byteLength)
  if (sealed.length < headerBytes) throw unreadable('It is cut off.')
  const version = sealed.readUInt8(0)
  if (version !== formatVersion)
    throw unreadable(`Its format is ${version}; this version reads format ${formatVersion}.`)
  const body = sealed.subarray(headerBytes)
  if (body.length !== sealed.readUInt32BE(1)) throw unreadable('Its length is not the one written down.')
  if (crc32(body) !== sealed.readUInt32BE(5)) throw unreadable('Its checksum does not match.')
  try {
    return deserialize(body)
  } catch (cause) {
    throw new TautlineError('checkpoint-unreadable', 'It was written by another version of Node.', { cause })
  }
}

const unreadable = (detail: string): TautlineError => new TautlineError('checkpoint-unreadable', detail)
