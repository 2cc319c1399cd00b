import { createRequire } from 'node:module'
import { gzipSync } from 'node:zlib'
import fc from 'fast-check'
import { expect, test } from 'vitest'
import { decompress } from '../../src/feeds/decompress.ts'

// Neither package has types; both serve as oracles only.
const require = createRequire(import.meta.url)
const snappyjs = require('snappyjs') as { compress(bytes: Uint8Array): Uint8Array }
const lz4js = require('lz4js') as { compress(bytes: Uint8Array): Uint8Array }

/** As snappy-java frames its blocks: magic, version 1, compatible with 1, then length and block in turn. */
function xerial(bytes: Uint8Array, blockSize: number): Buffer {
  const head = Buffer.from('82534e41505059000000000100000001', 'hex')
  const parts = [head]
  for (let p = 0; p < bytes.length; p += blockSize) {
    const block = snappyjs.compress(bytes.subarray(p, p + blockSize))
    const length = Buffer.alloc(4)
    length.writeUInt32BE(block.length)
    parts.push(length, Buffer.from(block))
  }
  return Buffer.concat(parts)
}

/** A zstd frame of raw blocks (RFC 8878, section 3.1.1): window of 1 KiB · 2^exponent, no content size. */
function rawZstd(bytes: Uint8Array, exponent = 10): Buffer {
  const block = Buffer.alloc(3)
  block.writeUIntLE((bytes.length << 3) | 1, 0, 3)
  return Buffer.concat([Buffer.from([0x28, 0xb5, 0x2f, 0xfd, 0, exponent << 3]), block, bytes])
}

const bytes = fc
  .array(
    fc.oneof(
      fc.constantFrom('abcabcabc', '{"signal":"QUAY","time":17000', '0'.repeat(300)),
      fc.string({ unit: 'binary' }),
    ),
    {
      maxLength: 60,
    },
  )
  .map((parts) => new Uint8Array(Buffer.from(parts.join(''))))

const codecs = [
  ['gzip', 1, (plain: Uint8Array) => gzipSync(plain)],
  ['Snappy, bare', 2, (plain: Uint8Array) => Buffer.from(snappyjs.compress(plain))],
  ['Snappy, framed', 2, (plain: Uint8Array) => xerial(plain, 300)],
  ['LZ4', 3, (plain: Uint8Array) => Buffer.from(lz4js.compress(plain))],
  ['zstd, raw blocks', 4, (plain: Uint8Array) => rawZstd(plain.subarray(0, 100_000))],
] as const

test.for(codecs)('%s: what another library compressed comes back', ([, codec, compress]) => {
  fc.assert(
    fc.property(bytes, (plain) => {
      const back = decompress(codec, compress(plain))
      expect(back).toEqual({ ok: true, value: Buffer.from(plain) })
    }),
    { seed: 1, numRuns: 300 },
  )
})

test.for(codecs)('%s: damage is a value, never a throw or a hang', ([, codec, compress]) => {
  const hits = fc.array(fc.tuple(fc.nat(), fc.integer({ min: 0, max: 255 })), { minLength: 1, maxLength: 4 })
  let failures = 0
  fc.assert(
    fc.property(bytes, hits, fc.nat(), (plain, changes, cut) => {
      const packed = Buffer.from(compress(plain))
      const damaged = packed.subarray(0, cut % (packed.length + 1))
      for (const [at, byte] of changes) if (damaged.length > 0) damaged[at % damaged.length] = byte
      if (!decompress(codec, damaged, 1 << 20).ok) failures++
    }),
    { seed: 2, numRuns: 2000 },
  )
  expect(failures).toBeGreaterThan(1000)
})

test.for(codecs.slice(0, 4))('%s: what would grow beyond the limit is refused', ([, codec, compress]) => {
  const bomb = compress(new Uint8Array(5_000_000))
  expect(bomb.length).toBeLessThan(400_000)
  expect(decompress(codec, bomb, 1_000_000).ok).toBe(false)
  expect(decompress(codec, bomb, 5_000_000).ok).toBe(true)
})

test('zstd: a window beyond the limit is refused before it is set aside', () => {
  expect(decompress(4, rawZstd(Buffer.from('abc'), 20)).ok).toBe(false)
  expect(decompress(4, rawZstd(Buffer.from('abc'), 16))).toEqual({ ok: true, value: Buffer.from('abc') })
})

test('a literal of negative length in Snappy does not turn in a circle', () => {
  expect(decompress(2, Buffer.from([10, 0xfc, 0xfa, 0xff, 0xff, 0xff, 0, 0, 0, 0])).ok).toBe(false)
})

test('LZ4: checksums of blocks and content, and a content size, are allowed for', () => {
  const block = Buffer.from([0x50, ...Buffer.from('abcde')])
  const flags = 0x40 | 0x20 | 0x10 | 0x08 | 0x04
  const frame = Buffer.concat([
    Buffer.from([0x04, 0x22, 0x4d, 0x18, flags, 0x40]),
    Buffer.from([5, 0, 0, 0, 0, 0, 0, 0, 0xaa]),
    Buffer.from([block.length, 0, 0, 0]),
    block,
    Buffer.from([1, 2, 3, 4]),
    Buffer.from([0, 0, 0, 0]),
    Buffer.from([5, 6, 7, 8]),
  ])
  expect(decompress(3, frame)).toEqual({ ok: true, value: Buffer.from('abcde') })
})

test('an unknown compression is a failure', () => {
  expect(decompress(5, Buffer.from('x'))).toMatchObject({ ok: false })
})
