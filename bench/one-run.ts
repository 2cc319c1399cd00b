import { lastValueFrom, Subject } from 'rxjs'
import { longestSlice, systemDrive } from '../src/commands/drive.ts'
import { openEnsembles } from '../src/commands/open-ensembles.ts'
import { openFeed } from '../src/feeds/open-feed.ts'
import { pipeline } from '../src/pipeline.ts'
import { readSettings } from '../src/settings/read-settings.ts'

/**
 * One run of the pipeline over the feeds of a settings file, in a process of its own: `one-run.js SETTINGS
 * READINGS`. Ends when the feeds do or when so many readings were taken; prints figures as JSON.
 */
export interface RunFigures {
  readonly readings: number
  readonly frames: number
  readonly spectra: number
  /** From the start of reading (Kafka: when the partitions are assigned) to the last effect. */
  readonly seconds: number
  readonly cpuSeconds: number
  readonly residentMiB: number
  /** Milliseconds by room; `feeds` is what is left of the whole. */
  readonly rooms: Readonly<Record<string, number>>
}

const [settingsPath = '', wanted = '0'] = process.argv.slice(2)
const read = readSettings(settingsPath, process.env)
if (!read.ok) throw new Error(JSON.stringify(read.error))
const { settings } = read.value
const drive = systemDrive(Date.now, null)
const rooms: Record<string, number> = { feeds: 0, frames: 0, window: 0, spectrum: 0, bulk: 0, regime: 0 }
const ensembles = openEnsembles(settings)
for (const ensemble of ensembles) {
  const take = ensemble.take.bind(ensemble)
  ensemble.take = (...args) => {
    const before = drive.lap()
    const made = take(...args)
    rooms.frames! += drive.lap() - before
    return made
  }
}
const feeds = Object.entries(settings.feeds).map(([name, feed]) =>
  openFeed(name, feed, { now: Date.now, log: () => {} }),
)
const stop = new Subject<void>()
let readings = 0
let frames = 0
let spectra = 0
let started = drive.lap()
let cpu = process.cpuUsage()
let ended = Number.NaN
const run = pipeline({
  feeds,
  ensembles,
  drive,
  sliceMs: longestSlice,
  stop,
  effects({ arrival: { feed, event }, judged }) {
    if (event.type === 'assigned' && feed?.kind === 'kafka') {
      started = drive.lap()
      cpu = process.cpuUsage()
    }
    for (const one of judged) {
      frames++
      if (one.share !== null) spectra++
      for (const [room, ms] of Object.entries(one.spent)) rooms[room]! += ms
    }
    ended = drive.lap()
    if (event.type !== 'batch') return
    readings += event.batch.count
    if (Number(wanted) > 0 && readings >= Number(wanted)) stop.next()
  },
})
await lastValueFrom(run, { defaultValue: null })
const used = process.cpuUsage(cpu)
const seconds = (ended - started) / 1000
rooms.feeds = seconds * 1000 - Object.values(rooms).reduce((sum, ms) => sum + ms, 0)
const figures: RunFigures = {
  readings,
  frames,
  spectra,
  seconds,
  cpuSeconds: (used.user + used.system) / 1e6,
  residentMiB: process.memoryUsage().rss / 2 ** 20,
  rooms,
}
console.log(JSON.stringify(figures))
process.exit(0)
