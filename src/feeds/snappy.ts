import { failed, ok, type Result } from '../errors.ts'

/** First bytes of the stream that Kafka's Java producers write around Snappy blocks (snappy-java's own framing). */
const xerialMagic = Buffer.from([0x82, 0x53, 0x4e, 0x41, 0x50, 0x50, 0x59, 0x00])
const xerialHeader = 16

/** Decompresses Snappy, framed as snappy-java does or one bare block, to at most `limit` bytes. */
export function unsnappy(bytes: Buffer, limit: number): Result<Buffer, string> {
  if (!bytes.subarray(0, xerialMagic.length).equals(xerialMagic)) return unsnappyBlock(bytes, limit)
  const parts: Buffer[] = []
  let total = 0
  let p = xerialHeader
  while (p < bytes.length) {
    if (p + 4 > bytes.length) return failed('snappy: cut off')
    const length = bytes.readUInt32BE(p)
    p += 4
    if (p + length > bytes.length) return failed('snappy: cut off')
    const part = unsnappyBlock(bytes.subarray(p, p + length), limit - total)
    if (!part.ok) return part
    parts.push(part.value)
    total += part.value.length
    p += length
  }
  return ok(parts.length === 1 ? parts[0]! : Buffer.concat(parts))
}

/** One block by the Snappy format description: a varint of the length, then literals and copies. */
function unsnappyBlock(bytes: Buffer, limit: number): Result<Buffer, string> {
  let length = 0
  let p = 0
  for (let shift = 0; ; shift += 7) {
    const byte = bytes[p++]
    if (byte === undefined || shift > 28) return failed('snappy: no length')
    length += (byte & 127) * 2 ** shift
    if (byte < 128) break
  }
  if (length > limit) return failed('snappy: more than a record batch may hold')
  const into = Buffer.allocUnsafe(length)
  let at = 0
  while (p < bytes.length) {
    const tag = bytes[p++]!
    const kind = tag & 3
    if (kind === 0) {
      let size = (tag >>> 2) + 1
      if (size > 60) {
        const width = size - 60
        if (p + width > bytes.length) return failed('snappy: cut off')
        size = bytes.readUIntLE(p, width) + 1
        p += width
      }
      if (p + size > bytes.length || at + size > length) return failed('snappy: damaged')
      bytes.copy(into, at, p, p + size)
      p += size
      at += size
    } else {
      const width = kind === 3 ? 4 : kind
      if (p + width > bytes.length) return failed('snappy: cut off')
      const low = bytes.readUIntLE(p, width)
      const distance = kind === 1 ? low + ((tag >>> 5) << 8) : low
      const size = kind === 1 ? ((tag >>> 2) & 7) + 4 : (tag >>> 2) + 1
      p += width
      if (distance === 0 || distance > at || at + size > length) return failed('snappy: damaged')
      for (const end = at + size; at < end; at++) into[at] = into[at - distance]!
    }
  }
  return at === length ? ok(into) : failed('snappy: cut off')
}
