import { spawn } from 'node:child_process'
import { type DemoClock, defaultClock, roundFrames } from '../../demo-feeds/demo-feed.ts'
import { deskEvents, deskReadings } from '../../demo-feeds/desk.ts'
import { demoSettings } from '../../demo-feeds/settings.ts'
import { stationEvents, stationReadings } from '../../demo-feeds/station.ts'
import { GeneratedFeed } from '../feeds/generated-feed.ts'
import { structuredLog } from '../observe/log.ts'
import { type Settings, settingsSchema } from '../settings/schema.ts'
import { openStore } from '../store/open-store.ts'
import type { DemoOptions, ExitStatus } from './commands.ts'
import { Monitor } from './monitor.ts'
import { openEnsembles } from './open-ensembles.ts'
import { packageVersion } from './package-version.ts'
import { RecordWriter } from './record-writer.ts'
import { stopSignals } from './stop-signals.ts'
import { openRoutes } from './watch.ts'

const rounds = 96
const note =
  'An invented desk and an invented pumping station, played faster than real time. No market, no plant, no advice.'

/**
 * The invented desk and station through the very pipeline of `watch`, with the page. Routes, heartbeat, store
 * and page of a settings file are used where one is given. @throws TautlineError
 */
export async function demo(options: DemoOptions): Promise<ExitStatus> {
  const { io, speed, json, every, given } = options
  const secrets = given?.secrets ?? null
  const log = structuredLog({
    level: options.logLevel,
    destination: io.stderr,
    redact: (text) => secrets?.redact(text) ?? text,
    now: io.now,
  })
  const clock = clockBefore(io.now())
  const settings = settingsFor(options, clock)
  const stop = stopSignals()
  const store = openStore(given === null ? ':memory:' : settings.store.path)
  try {
    const monitor = new Monitor({
      settings,
      version: packageVersion(),
      feeds: [
        new GeneratedFeed('ticks', deskReadings(clock, deskEvents(rounds)), speed),
        new GeneratedFeed('station', stationReadings(clock, stationEvents(rounds)), speed),
      ],
      ensembles: openEnsembles(settings),
      routes: openRoutes(settings, log),
      store,
      checkpoints: null,
      writer: json ? new RecordWriter(io.stdout, every) : null,
      demo: { speed, note },
      log,
      stop: stop.asked,
      now: io.now,
      listening: (url) => {
        io.stderr.write(`Tautline demo: ${url}  (Ctrl-C ends it)\n${note}\n`)
        if (options.open) openBrowser(url)
      },
    })
    await monitor.run()
    return 0
  } finally {
    stop.release()
    store.close()
  }
}

/** All rounds lie before the present, so that no event time is ahead of it. */
function clockBefore(now: number): DemoClock {
  const { stepMs } = defaultClock
  const frames = rounds * roundFrames
  const hour = 3_600_000
  const start = Math.floor((now - frames * stepMs) / hour) * hour
  return { ...defaultClock, start, frames }
}

function settingsFor({ given, port }: DemoOptions, clock: DemoClock): Settings {
  const { ensembles = {} } = demoSettings(clock, rounds)
  const own = settingsSchema.parse({
    ensembles: {
      desk: { ...ensembles.desk, feeds: ['ticks'] },
      station: { ...ensembles.station, feeds: ['station'] },
    },
    routes: { log: { log: {} } },
    page: { listen: `127.0.0.1:${port}` },
  })
  if (given === null) return own
  const { routes, heartbeat, store, page } = given.settings
  return { ...own, routes, heartbeat, store, page }
}

function openBrowser(url: string): void {
  const opener = { darwin: 'open', win32: 'explorer' }[process.platform as string] ?? 'xdg-open'
  const child = spawn(opener, [url], { stdio: 'ignore', detached: true })
  child.on('error', () => {})
  child.unref()
}
