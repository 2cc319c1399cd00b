import { writeFile } from 'node:fs/promises'
import { join } from 'node:path'
import { afterEach, expect, inject, test } from 'vitest'
import { type DemoChunk, type DemoClock, defaultClock } from '../../demo-feeds/demo-feed.ts'
import { deskEvents, deskReadings, deskSignals } from '../../demo-feeds/desk.ts'
import { produce } from '../../demo-feeds/produce.ts'
import { recorded } from '../../demo-feeds/recorded.ts'
import { freePort, scratchFolder, until } from '../support/host.ts'
import { removeFolder } from './support/child.ts'
import { KafkaBroker } from './support/kafka-broker.ts'
import { uniqueName } from './support/kafka-client.ts'
import { Tautline } from './support/tautline.ts'

const clock: DemoClock = { ...defaultClock, start: Date.UTC(2026, 9, 5, 8), frames: 900 }

/** The invented desk, its market-mode spike brought forward so that it is called within 900 frames. */
const desk = (part: Partial<DemoClock> = {}): Generator<DemoChunk> =>
  deskReadings(
    { ...clock, ...part },
    deskEvents().flatMap((event) =>
      event.what === 'market-mode-spike' ? [{ ...event, from: 520, to: null }] : [],
    ),
  )

const ensemble = `
ensembles:
  desk:
    signals: [${deskSignals.join(', ')}]
    clock: { step: 5s, lateness: 2s, stale-after: 60s }
    window: { frames: 120 }
    reference: { frames: 240 }
`

const folders: string[] = []
const running: { stop(): Promise<unknown>; status: number | null }[] = []
afterEach(async () => {
  for (const one of running.splice(0)) if (one.status === null) await one.stop()
  for (const folder of folders.splice(0)) await removeFolder(folder)
})

async function settingsFile(text: string): Promise<string> {
  const folder = await scratchFolder('watch')
  folders.push(folder)
  const path = join(folder, 'settings.yaml')
  await writeFile(path, text)
  return path
}

function start(args: readonly string[]): Tautline {
  const tautline = new Tautline(args)
  running.push(tautline)
  return tautline
}

const kafkaSettings = async (bootstrap: string, topic: string): Promise<string> => `${ensemble}
feeds:
  ticks:
    kafka: { brokers: ["${bootstrap}"], topic: ${topic}, group: ${uniqueName('group')}, from: earliest, max-wait: 100ms }
    format: { signal: /signal, time: /time, value: /value, unit: ms }
page: { listen: "127.0.0.1:${await freePort()}" }
`

/** The lines of stdout that are frames and shifts: what must not depend on the way in. */
const verdicts = (lines: readonly string[]): string[] =>
  lines.filter((line) => line.startsWith('{"type":"frame"') || line.startsWith('{"type":"shift"'))

async function replayOfFile(): Promise<string[]> {
  const path = await settingsFile(`${ensemble}
feeds:
  ticks: { file: { path: ticks.ndjson }, format: { signal: /signal, time: /time, value: /value, unit: ms } }
`)
  await writeFile(join(path, '..', 'ticks.ndjson'), recorded(desk(), 'ndjson'))
  const replay = start(['replay', '--json', '--settings', path])
  expect(await replay.ended(), replay.stderr).toBe(0)
  return replay.lines
}

test('the same readings through a file and through a 4-partition topic give byte-identical frames and shifts', async () => {
  const fromFile = verdicts(await replayOfFile())
  expect(fromFile.some((line) => line.startsWith('{"type":"shift"'))).toBe(true)

  const topic = uniqueName('ticks')
  const bootstrap = inject('kafka')
  await produce({ brokers: [bootstrap], topic, partitions: 4, speed: 0, compress: false }, desk())
  const watch = start([
    'watch',
    '--json',
    '--settings',
    await settingsFile(await kafkaSettings(bootstrap, topic)),
  ])
  // The last steps stay open until time goes on: a file ends, a topic does not.
  await until('the frames', async () => verdicts(watch.lines).length >= fromFile.length - 2)
  expect(await watch.stop(), watch.stderr).toBe(0)
  const fromKafka = verdicts(watch.lines)
  expect(fromKafka).toEqual(fromFile.slice(0, fromKafka.length))
})

test('a broker that stops and comes back under load costs nothing: no reading lost or counted twice, and readiness tells the truth', async () => {
  const fromFile = verdicts(await replayOfFile())
  const broker = await KafkaBroker.start(inject('kafkaTools'))
  try {
    const topic = uniqueName('ticks')
    await broker.createTopic(topic, 4)
    const watch = start([
      'watch',
      '--json',
      '--settings',
      await settingsFile(await kafkaSettings(broker.bootstrap, topic)),
    ])
    const page = await watch.page()
    const readiness = async (): Promise<{ status: number; reasons: string[] }> => {
      const answer = await fetch(`${page}health/ready`)
      const body = (await answer.json()) as { reasons: string[] }
      return { status: answer.status, reasons: body.reasons }
    }
    await until('readiness', async () => (await readiness()).status === 200)

    const sending = produce(
      { brokers: [broker.bootstrap], topic, partitions: 4, speed: 250, compress: false },
      desk(),
    )
    await until('the first frames', async () => verdicts(watch.lines).length > 100)
    await broker.stop()
    await until('the loss to be told', async () => (await readiness()).status === 503)
    expect((await readiness()).reasons.join()).toContain('ticks is not connected')
    expect((await fetch(`${page}health/live`)).status).toBe(200)
    await new Promise((resolve) => setTimeout(resolve, 5000))
    await broker.restart()

    const sent = await sending
    await until('readiness', async () => (await readiness()).status === 200)
    await until('the rest', async () => verdicts(watch.lines).length >= fromFile.length - 2)
    expect(await watch.stop(), watch.stderr).toBe(0)
    const fromKafka = verdicts(watch.lines)
    expect(fromKafka).toEqual(fromFile.slice(0, fromKafka.length))
    const summary = watch.records.at(-1)!
    expect(summary.type).toBe('summary')
    if (summary.type !== 'summary') return
    expect(summary.readings).toBe(sent)
    expect(Object.keys(summary.dropped).filter((reason) => reason !== 'duplicate')).toEqual([])
  } finally {
    await broker.dispose()
  }
})

test('told to stop, it saves its place, and goes on there', async () => {
  const fromFile = verdicts(await replayOfFile())
  const topic = uniqueName('ticks')
  const bootstrap = inject('kafka')
  const path = await settingsFile(await kafkaSettings(bootstrap, topic))
  await produce({ brokers: [bootstrap], topic, partitions: 4, speed: 0, compress: true }, desk())
  const first = start(['watch', '--json', '--settings', path])
  await until('some frames', async () => verdicts(first.lines).length > 50)
  expect(await first.stop(), first.stderr).toBe(0)
  const second = start(['watch', '--json', '--settings', path])
  await until(
    'the rest',
    async () => verdicts(first.lines).length + verdicts(second.lines).length >= fromFile.length - 2,
  )
  expect(await second.stop(), second.stderr).toBe(0)
  const both = [...verdicts(first.lines), ...verdicts(second.lines)]
  expect(both).toEqual(fromFile.slice(0, both.length))
})
