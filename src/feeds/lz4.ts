import { failed, ok, type Result } from '../errors.ts'

const magic = 0x184d2204
const uncompressed = 0x80000000

/**
 * Decompresses one LZ4 frame (LZ4 Frame Format 1.6, from memory) to at most `limit` bytes: linked or
 * independent blocks, content size and checksums allowed for. Checksums are not verified.
 */
export function unlz4(bytes: Buffer, limit: number): Result<Buffer, string> {
  if (bytes.length < 7 || bytes.readUInt32LE(0) !== magic) return failed('lz4: no frame')
  const flags = bytes[4]!
  if (flags >>> 6 !== 1) return failed('lz4: unknown version')
  if ((flags & 1) !== 0) return failed('lz4: needs a dictionary')
  const blockChecksum = (flags & 16) !== 0
  const block = { 4: 1 << 16, 5: 1 << 18, 6: 1 << 20, 7: 1 << 22 }[(bytes[5]! >>> 4) & 7]
  if (block === undefined) return failed('lz4: unknown size of blocks')
  let into = Buffer.allocUnsafe(Math.min(limit, 4 * bytes.length + block))
  let at = 0
  let p = 7 + ((flags & 8) !== 0 ? 8 : 0)
  for (;;) {
    if (p + 4 > bytes.length) return failed('lz4: cut off')
    const word = bytes.readUInt32LE(p)
    p += 4
    if (word === 0) break
    const size = word % uncompressed
    if (size > block || p + size > bytes.length) return failed('lz4: damaged')
    if (at + block > into.length && into.length < limit) {
      const larger = Buffer.allocUnsafe(Math.min(limit, 2 * into.length + block))
      into.copy(larger, 0, 0, at)
      into = larger
    }
    if (word >= uncompressed) {
      if (at + size > into.length) return failed('lz4: more than a record batch may hold')
      at += bytes.copy(into, at, p, p + size)
    } else at = unlz4Block(bytes, p, p + size, into, at, Math.min(into.length, at + block))
    if (at < 0) return failed('lz4: damaged, or more than a record batch may hold')
    p += size + (blockChecksum ? 4 : 0)
  }
  return ok(into.subarray(0, at))
}

/** One block (LZ4 Block Format): sequences of literals and a match. Gives the new end, or -1. */
function unlz4Block(
  bytes: Buffer,
  from: number,
  to: number,
  into: Buffer,
  start: number,
  end: number,
): number {
  let p = from
  let at = start
  while (p < to) {
    const token = bytes[p++]!
    let literals = token >>> 4
    if (literals === 15)
      for (let byte = 255; byte === 255; literals += byte) {
        if (p >= to) return -1
        byte = bytes[p++]!
      }
    if (p + literals > to || at + literals > end) return -1
    at += bytes.copy(into, at, p, p + literals)
    p += literals
    if (p === to) return at
    if (p + 2 > to) return -1
    const distance = bytes[p]! | (bytes[p + 1]! << 8)
    p += 2
    let size = (token & 15) + 4
    if (size === 19)
      for (let byte = 255; byte === 255; size += byte) {
        if (p >= to) return -1
        byte = bytes[p++]!
      }
    if (distance === 0 || distance > at || at + size > end) return -1
    for (const stop = at + size; at < stop; at++) into[at] = into[at - distance]!
  }
  return at
}
