import { deflateSync, gzipSync } from 'node:zlib'
import { Random } from '../../support/random.ts'
import { type Case, type CaseGroup, good, limit } from './case.ts'

const line = `${good}\n`
const utf16 = (text: string) => Buffer.from(`\ufeff${text}`, 'utf16le')
const tenMegabytes = 10 * 1024 * 1024

/** Bytes without meaning, the same at every run; no line feed among the first, no gzip mark. */
function noise(length: number, seed: number): Buffer {
  const random = new Random(seed)
  return Buffer.from(Uint8Array.from({ length }, () => 11 + Math.floor(random.uniform() * 245)))
}

const cases: readonly Case[] = [
  ['an empty file', '', {}],
  ['a lone line feed', '\n', {}],
  ['a thousand line feeds', '\n'.repeat(1000), {}],
  ['blanks and line ends of every kind', ' \t\r\n\r\n \r\n', {}],
  ['one byte', 'x', { unreadable: 1 }],
  ['a byte order mark alone', '\ufeff', {}],
  ['a byte order mark in front', `\ufeff${line}`, { readings: 1 }],
  ['two byte order marks', `\ufeff\ufeff${line}`, { unreadable: 1 }],
  ['half a byte order mark', Buffer.from([0xef, 0xbb]), { unreadable: 1 }],
  ['UTF-16 little-endian with its mark', utf16(line), { error: 'feed-encoding' }],
  ['UTF-16 big-endian with its mark', utf16(line).swap16(), { error: 'feed-encoding' }],
  ['UTF-16 without a mark', Buffer.from(line, 'utf16le'), { unreadable: 2 }],
  ['Latin-1 in the signal', Buffer.from(good.replace('QUAY', 'QU\xc5Y'), 'latin1'), { 'bad-signal': 1 }],
  ['no line end at the end', `${line}${good}`, { readings: 2 }],
  ['CRLF', `${good}\r\n${good}\r\n`, { readings: 2 }],
  ['CR alone', `${good}\r${good}\r`, { unreadable: 1 }],
  ['a line separator of Unicode', `${good}\u2028${good}`, { unreadable: 1 }],
  [
    'a line of 10 MB',
    () => Buffer.concat([Buffer.from(line), Buffer.alloc(tenMegabytes, 120), Buffer.from(`\n${line}`)]),
    { readings: 2, 'too-long': 1 },
  ],
  [
    'a line of 10 MB without an end',
    () => Buffer.concat([Buffer.from(line), Buffer.alloc(tenMegabytes, 120)]),
    { readings: 1, 'too-long': 1 },
  ],
  [
    'a good record of 10 MB',
    () => Buffer.from(`{"x":"${'x'.repeat(tenMegabytes)}",${good.slice(1)}\n${line}`),
    { readings: 1, 'too-long': 1 },
  ],
  ['10 MB of NUL bytes', () => Buffer.alloc(tenMegabytes), { 'too-long': 1 }],
  ['10 MB of open brackets', () => Buffer.alloc(tenMegabytes, '['), { 'too-long': 1 }],
  [
    'three lines of 1 MB',
    () => Buffer.from(`${'y'.repeat(1 << 20)}\n`.repeat(3) + line),
    { readings: 1, 'too-long': 3 },
  ],
  [
    'a record just beyond the limit',
    `${good}${' '.repeat(limit - good.length + 1)}\n${line}`,
    { readings: 1, 'too-long': 1 },
  ],
  ['a record as long as the limit', `${good}${' '.repeat(limit - good.length)}\n${line}`, { readings: 2 }],
  ['100,000 short lines of rubbish', () => Buffer.from('x\n'.repeat(100_000)), { unreadable: 100_000 }],
  ['noise', noise(60_000, 1), { unreadable: 1 }],
  [
    '20,005 signals',
    () =>
      Buffer.from(Array.from({ length: 20_005 }, (_, i) => `${good.replace('QUAY', `S${i}`)}\n`).join('')),
    { readings: 20_000, 'too-many-signals': 5 },
  ],
  ['a ZIP archive', Buffer.concat([Buffer.from('PK\x03\x04'), noise(300, 2)]), { unreadable: 1 }],
  ['zlib without the gzip header', () => deflateSync(Buffer.alloc(50, 'abc')), { unreadable: 1 }],
  ['gzip of nothing', () => gzipSync(''), {}],
  ['gzip of rubbish', () => gzipSync('x\ny\n'), { unreadable: 2 }],
  ['the first two bytes of gzip alone', Buffer.from([0x1f, 0x8b]), { 'bad-compression': 1 }],
  [
    'the gzip mark before text',
    Buffer.concat([Buffer.from([0x1f, 0x8b]), Buffer.from(line)]),
    { 'bad-compression': 1 },
  ],
  ['gzip cut off in its header', () => gzipSync(line).subarray(0, 7), { 'bad-compression': 1 }],
  [
    'gzip cut off before its check sum',
    () => {
      const packed = gzipSync(line.repeat(100))
      return packed.subarray(0, packed.length - 8)
    },
    { readings: 100, 'bad-compression': 1 },
  ],
  [
    'gzip with an unknown method',
    () => {
      const packed = gzipSync(line)
      packed[2] = 7
      return packed
    },
    { 'bad-compression': 1 },
  ],
  [
    'gzip with rubbish behind (zlib gives nothing of the piece that it fails in)',
    () => Buffer.concat([gzipSync(line), Buffer.from('rubbish')]),
    { 'bad-compression': 1 },
  ],
  ['gzip with zeros behind', () => Buffer.concat([gzipSync(line), Buffer.alloc(1000)]), { readings: 1 }],
  ['gzip in gzip', () => gzipSync(gzipSync('x')), { unreadable: 1 }],
  ['gzip of two members', () => Buffer.concat([gzipSync(good), gzipSync(`\n${line}`)]), { readings: 2 }],
  ['50 MB of NUL bytes in 50 KB of gzip', () => gzipSync(Buffer.alloc(50 * 1024 * 1024)), { 'too-long': 1 }],
  [
    'a gzip line of 10 MB',
    () =>
      gzipSync(Buffer.concat([Buffer.from(line), Buffer.alloc(tenMegabytes, 120), Buffer.from(`\n${line}`)])),
    { readings: 2, 'too-long': 1 },
  ],
]

export const byteGroups: readonly CaseGroup[] = [{ title: 'bytes', format: 'ndjson', cases }]
