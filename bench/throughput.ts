import { spawnSync } from 'node:child_process'
import { existsSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { parseArgs } from 'node:util'
import type { RunFigures } from './one-run.ts'
import {
  baselineEnvironment,
  baselinePython,
  cache,
  describeMachine,
  median,
  run,
  spread,
} from './support.ts'

/**
 * Throughput of the whole chain on a recorded NDJSON of 100 signals, ten readings a signal and frame, 8,000 frames, beside
 * the script that one would write instead (bench/baseline/baseline.py), interleaved in one run. With --kafka
 * HOST:PORT the same through a 4-partition topic, one JSON reading a message.
 */
const { values } = parseArgs({
  options: {
    pairs: { type: 'string', default: '5' },
    kafka: { type: 'string' },
    readings: { type: 'string', default: '500000' },
  },
})
const baselineScript = fileURLToPath(new URL('../../bench/baseline/baseline.py', import.meta.url))
const generator = fileURLToPath(new URL('../../bench/baseline/gen.py', import.meta.url))
const oneRun = fileURLToPath(new URL('./one-run.js', import.meta.url))

const python = baselinePython()
const recording = join(cache, 'f100long.ndjson')
if (!existsSync(recording)) run(python, [generator, '100', '8000', '10', join(cache, 'f100long')])

const format = '{ signal: /signal, time: /time, value: /value, unit: ms }'
const chain = (clockAndRest: string, feed: string): string => `
ensembles:
  bench:
    signals: { pattern: "S*" }
    clock: { step: 1s, lateness: 500ms }
    window: { frames: 200 }
${clockAndRest}
feeds:
  bench: ${feed}
`
/** What the script computes: plain correlation, W2 to the window that ended T frames ago, no limits learnt. */
const likeForLike = `    common-volatility: keep
    truncate: off
    reference: { lagged: 200 }
    limits: { explicit: { leading-share: 0.5, spectral-distance: 2, frobenius: 2, partner-distance: 2 } }`
/** As it is delivered: scale, common volatility, truncation with its certificate, limits from a reference. */
const asShipped = '    reference: { frames: 300 }'

const scratch = mkdtempSync(join(tmpdir(), 'tautline-bench-'))
const settingsFile = (name: string, text: string): string => {
  const path = join(scratch, `${name}.yaml`)
  writeFileSync(path, text)
  return path
}

function ours(path: string, readings: number): RunFigures {
  const done = spawnSync(process.execPath, [oneRun, path, String(readings)], { encoding: 'utf8' })
  if (done.status !== 0) throw new Error(done.stderr)
  return JSON.parse(done.stdout.trim().split('\n').at(-1) ?? '') as RunFigures
}

function theirs(source: string, form: string): { readings: number; seconds: number; cpuSeconds: number } {
  const told = run(python, [baselineScript, source, '100', form], baselineEnvironment())
  const match = /(\d+) readings.*wall ([\d.]+) s cpu ([\d.]+) s/.exec(told)
  if (match === null) throw new Error(told)
  return { readings: Number(match[1]), seconds: Number(match[2]), cpuSeconds: Number(match[3]) }
}

function compare(
  title: string,
  settings: Readonly<Record<string, string>>,
  source: string,
  forms: readonly string[],
  readings: number,
): void {
  const rates = new Map<string, number[]>()
  const note = (name: string, rate: number): void => void rates.set(name, [...(rates.get(name) ?? []), rate])
  const rooms: Record<string, number[]> = {}
  let resident = 0
  for (let pair = 0; pair < Number(values.pairs); pair++) {
    for (const form of forms) {
      const { readings: count, seconds } = theirs(source, form)
      note(`script, ${form}`, count / seconds / 1e6)
    }
    for (const [name, path] of Object.entries(settings)) {
      const figures = ours(path, readings)
      note(name, figures.readings / figures.seconds / 1e6)
      resident = Math.max(resident, figures.residentMiB)
      if (name !== Object.keys(settings)[0]) continue
      for (const [room, ms] of Object.entries(figures.rooms)) {
        rooms[room] = [...(rooms[room] ?? []), ms / (figures.seconds * 1000)]
      }
    }
  }
  console.log(`\n${title}: million readings a second, median [range] of ${values.pairs} interleaved runs`)
  for (const [name, list] of rates) console.log(`  ${name.padEnd(34)} ${spread(list)}`)
  const [first = ''] = Object.keys(settings)
  for (const form of forms) {
    const ratios = rates.get(first)!.map((rate, k) => rate / rates.get(`script, ${form}`)![k]!)
    console.log(`  ${`ratio to ${form}`.padEnd(34)} ${spread(ratios)}`)
  }
  const shares = Object.entries(rooms).map(([room, list]) => `${room} ${(100 * median(list)).toFixed(0)} %`)
  console.log(
    `  share of the time by room: ${shares.join(', ')}; resident at most ${resident.toFixed(0)} MiB`,
  )
}

console.log(`${new Date().toISOString().slice(0, 10)}, ${describeMachine(python)}`)
const file = `{ file: { path: ${JSON.stringify(recording)} }, format: ${format} }`
compare(
  'Recorded NDJSON, full spectrum every frame',
  {
    'tautline, the same computation': settingsFile('like', chain(likeForLike, file)),
    'tautline, as shipped': settingsFile('shipped', chain(asShipped, file)),
  },
  recording,
  ['cols-polars', 'rows-orjson'],
  0,
)
if (values.kafka !== undefined) {
  const { fillTopic } = await import('./fill-topic.ts')
  const count = Number(values.readings)
  const topic = await fillTopic(values.kafka, recording, count)
  const group = `bench-${process.pid}`
  const feed = (k: number): string =>
    `{ kafka: { brokers: ["${values.kafka}"], topic: ${topic}, group: ${group}-${k}, from: earliest }, format: ${format} }`
  compare(
    'Kafka, 4 partitions, one JSON reading a message, full spectrum every frame',
    { 'tautline, the same computation': settingsFile('kafka', chain(likeForLike, feed(0))) },
    `kafka://${values.kafka}/${topic}`,
    ['cols-polars', 'rows-orjson'],
    count,
  )
}
rmSync(scratch, { recursive: true })
