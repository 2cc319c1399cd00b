import { gunzipSync } from 'node:zlib'
import { Decompress } from 'fzstd'
import { failed, ok, type Result } from '../errors.ts'
import { unlz4 } from './lz4.ts'
import { unsnappy } from './snappy.ts'

/** Most that one record batch may become, whatever its sender says. */
export const mostDecompressed = 64 * 1024 * 1024

/** Decompresses the records of a Kafka record batch; `codec` as in the batch's attributes: 0 none … 4 zstd. */
export function decompress(codec: number, bytes: Buffer, limit = mostDecompressed): Result<Buffer, string> {
  switch (codec) {
    case 0:
      return ok(bytes)
    case 1:
      return guarded('gzip', () => gunzipSync(bytes, { maxOutputLength: limit }))
    case 2:
      return unsnappy(bytes, limit)
    case 3:
      return unlz4(bytes, limit)
    case 4:
      return hasLargeWindow(bytes, limit)
        ? failed('zstd: more than a record batch may hold')
        : guarded('zstd', () => unzstd(bytes, limit))
    default:
      return failed(`compression ${codec} is not known`)
  }
}

function guarded(codec: string, work: () => Buffer): Result<Buffer, string> {
  try {
    return ok(work())
  } catch (error) {
    return failed(`${codec}: ${error instanceof Error ? error.message : error}`)
  }
}

function unzstd(bytes: Buffer, limit: number): Buffer {
  const parts: Uint8Array[] = []
  let total = 0
  const stream = new Decompress((part) => {
    total += part.length
    if (total > limit) throw new Error('more than a record batch may hold')
    parts.push(part.slice())
  })
  stream.push(bytes, true)
  return Buffer.concat(parts)
}

const zstdMagic = Buffer.from([0x28, 0xb5, 0x2f, 0xfd])

/** Whether a frame asks for a larger window (RFC 8878, section 3.1.1.1): it would be set aside at once. */
function hasLargeWindow(bytes: Buffer, limit: number): boolean {
  for (let at = bytes.indexOf(zstdMagic); at >= 0; at = bytes.indexOf(zstdMagic, at + 4)) {
    const flags = bytes[at + 4] ?? 0
    const singleSegment = (flags & 32) !== 0
    const descriptor = bytes[at + 5] ?? 0
    const window = 2 ** (10 + (descriptor >>> 3)) * (1 + (descriptor & 7) / 8)
    if ((singleSegment ? contentSize(bytes, at) : window) > limit) return true
  }
  return false
}

/** Frame content size of a single-segment frame, bytes. */
function contentSize(bytes: Buffer, at: number): number {
  const flags = bytes[at + 4] ?? 0
  const width = [1, 2, 4, 8][flags >>> 6]!
  const from = at + 5 + [0, 1, 2, 4][flags & 3]!
  if (from + width > bytes.length) return 0
  if (width === 8) return Number(bytes.readBigUInt64LE(from))
  return bytes.readUIntLE(from, width) + (width === 2 ? 256 : 0)
}
