import { createWriteStream, realpathSync } from 'node:fs'
import { Readable } from 'node:stream'
import { pipeline } from 'node:stream/promises'
import { pathToFileURL } from 'node:url'
import { parseArgs } from 'node:util'
import { createGzip } from 'node:zlib'
import { defaultClock } from './demo-feed.ts'
import { clockFrom, clockHelp, clockOptions, readingsOf } from './demo-options.ts'
import { recorded, recordedFormats } from './recorded.ts'

const help = `Writes an invented feed into a file.

  node dist/demo-feeds/write.js --feed desk --format ndjson --out desk.ndjson.gz

  --out FILE        the file; compressed when its name ends in .gz
  --format NAME     ${recordedFormats.join(', ')} (default ndjson)
${clockHelp}
`

/** What the command line asks for, carried out. */
export async function write(args: readonly string[]): Promise<void> {
  const { values } = parseArgs({
    args: [...args],
    options: {
      ...clockOptions,
      out: { type: 'string' },
      format: { type: 'string', default: 'ndjson' },
    },
  })
  if (values.help) {
    console.log(help)
    return
  }
  const format = recordedFormats.find((name) => name === values.format)
  if (!format) throw new Error(`--format takes ${recordedFormats.join(', ')}, not "${values.format}"`)
  if (!values.out) throw new Error('--out FILE is missing')
  const clock = clockFrom(values, () => defaultClock.start)
  const text = Readable.from(recorded(readingsOf(values.feed, clock), format))
  const file = createWriteStream(values.out)
  if (values.out.endsWith('.gz')) await pipeline(text, createGzip(), file)
  else await pipeline(text, file)
}

if (process.argv[1] && import.meta.url === pathToFileURL(realpathSync(process.argv[1])).href)
  await write(process.argv.slice(2)).catch((error: unknown) => {
    console.error(`${error instanceof Error ? error.message : error}\n\n${help}`)
    process.exitCode = 1
  })
