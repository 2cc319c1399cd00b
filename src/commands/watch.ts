import { openRoute } from '../alerts/open-route.ts'
import type { Route } from '../alerts/route.ts'
import { TautlineError } from '../errors.ts'
import { kafkaClient } from '../feeds/kafka-client.ts'
import { openFeed } from '../feeds/open-feed.ts'
import { type Log, structuredLog } from '../observe/log.ts'
import type { Settings } from '../settings/schema.ts'
import { openStore } from '../store/open-store.ts'
import { Checkpoints } from './checkpoints.ts'
import type { ExitStatus, WatchOptions } from './commands.ts'
import { Monitor } from './monitor.ts'
import { openEnsembles } from './open-ensembles.ts'
import { packageVersion } from './package-version.ts'
import { RecordWriter } from './record-writer.ts'
import { stopSignals } from './stop-signals.ts'

/** Runs the monitor on live feeds until it is told to stop; then it saves its place. @throws TautlineError */
export async function watch(options: WatchOptions): Promise<ExitStatus> {
  const { io, json, every } = options
  const { settings, secrets, warnings } = options.read
  const log = structuredLog({
    level: options.logLevel,
    destination: io.stderr,
    redact: (text) => secrets.redact(text),
    now: io.now,
  })
  for (const { key, found, allowed } of warnings)
    log('warn', 'A setting is likely not meant so.', { key, found, allowed })
  if (Object.keys(settings.feeds).length === 0)
    throw new TautlineError('usage', 'The settings have no feed to watch.')
  const stop = stopSignals()
  const store = openStore(settings.store.path, { quarantine: settings.store.quarantine })
  try {
    const ensembles = openEnsembles(settings)
    const checkpoints = new Checkpoints(store, settings, io.now())
    const positions = checkpoints.restore(ensembles, log)
    const named = new Set(Object.keys(settings.feeds))
    for (const ensemble of ensembles) ensemble.keepFeeds(named, io.now())
    const feeds = Object.entries(settings.feeds).map(([name, feed]) => {
      const resumeAt = positions.get(name)
      return openFeed(name, feed, { now: io.now, log, ...(resumeAt === undefined ? {} : { resumeAt }) })
    })
    const monitor = new Monitor({
      settings,
      version: packageVersion(),
      feeds,
      ensembles,
      routes: openRoutes(settings, log),
      store,
      checkpoints,
      writer: json ? new RecordWriter(io.stdout, every) : null,
      demo: null,
      log,
      stop: stop.asked,
      now: io.now,
    })
    await monitor.run()
    return 0
  } finally {
    stop.release()
    store.close()
  }
}

/** Opens every route of the settings. @throws TautlineError */
export function openRoutes(settings: Settings, log: Log): Route[] {
  return Object.entries(settings.routes).map(([name, route]) => {
    const opened = openRoute(name, route, {
      log,
      kafka: (connection) => kafkaClient(connection, log),
      ...(settings.page.url === undefined ? {} : { source: settings.page.url }),
    })
    if (!opened.ok) throw opened.error
    return opened.value
  })
}
