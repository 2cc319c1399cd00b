import { readFileSync } from 'node:fs'
import { Readable } from 'node:stream'
import { openFeed } from '../../../src/feeds/open-feed.ts'
import type { DropCounts } from '../../../src/reasons.ts'
import type { FormatSettings } from '../../../src/settings/schema.ts'
import { Collected } from './collected.ts'
import { now } from './read.ts'

/** Hand-written: what must come of each input was put down before it was read. Texts stand for their UTF-8. */
export interface Case {
  readonly format: keyof typeof formats
  readonly title: string
  readonly text?: string
  readonly base64?: string
  /** Readings as signal, time, value; or only how many. */
  readonly readings: number | readonly (readonly [string, number, number])[]
  readonly dropped: DropCounts
  /** Code of the error that ends the reading. */
  readonly error?: string
  /** Longest record, bytes. */
  readonly limit?: number
}

const pointers = (signal: string, time: string, value: string, readings?: string): FormatSettings => ({
  signal,
  time,
  value,
  unit: 'ms',
  ...(readings === undefined ? {} : { readings }),
})

export const formats = {
  ndjson: 'ndjson',
  senml: 'senml',
  pointers: pointers('/sym', '/ts', '/px'),
  'escaped-pointers': pointers('/a~1b/c~0d', '//t/1', '/m~01n'),
  'inherited-pointers': pointers('/constructor/name', '/length', '/length'),
  readings: pointers('/s', '/t', '/v', '/data'),
  wide: { csv: 'wide', time: 'date', unit: 'rfc3339' },
  long: { csv: 'long', time: 'time', signal: 'signal', value: 'value', unit: 'rfc3339' },
} as const satisfies Record<string, FormatSettings>

export const cases: readonly Case[] = JSON.parse(
  readFileSync(new URL('../corpus/rubbish.json', import.meta.url), 'utf8'),
)
export const inputOf = ({ text, base64 }: Case): Buffer =>
  base64 === undefined ? Buffer.from(text ?? '', 'utf8') : Buffer.from(base64, 'base64')

/** What the feed that reads standard input makes of these pieces. */
export async function play(
  format: FormatSettings,
  pieces: Iterable<Buffer>,
  limit = 1 << 20,
): Promise<Collected> {
  const stdin = Readable.from(pieces, { objectMode: false })
  const settings = { stdin: {}, format, 'max-record-bytes': limit }
  const heard = new Collected(openFeed('test', settings, { now: () => now, log: () => {}, stdin }))
  await heard.ended
  return heard
}

export function* cut(bytes: Buffer, length: number): Generator<Buffer> {
  for (let at = 0; at < bytes.length; at += length) yield bytes.subarray(at, at + length)
}
