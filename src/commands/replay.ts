import { writeFileSync } from 'node:fs'
import { lastValueFrom } from 'rxjs'
import { cautions } from '../alerts/wording.ts'
import { TautlineError } from '../errors.ts'
import type { Feed } from '../feeds/feed.ts'
import { openFeed } from '../feeds/open-feed.ts'
import { structuredLog } from '../observe/log.ts'
import { summaryRecord } from '../observe/records.ts'
import { pipeline } from '../pipeline.ts'
import type { ExitStatus, ReplayOptions } from './commands.ts'
import { longestSlice, systemDrive } from './drive.ts'
import { openEnsembles } from './open-ensembles.ts'
import { Progress } from './progress.ts'
import { RecordWriter } from './record-writer.ts'
import { replayText } from './replay-text.ts'
import { ReportBook, type RunReport } from './run-report.ts'
import { stopSignals } from './stop-signals.ts'
import { Totals } from './totals.ts'

/**
 * Runs the pipeline over recorded readings as fast as it can: records or a text on stdout, progress on a
 * terminal, a report on demand. Pages nobody and leaves the store alone. @throws TautlineError
 */
export async function replay(options: ReplayOptions): Promise<ExitStatus> {
  const { io, json, every, expectSteady } = options
  const { settings, secrets } = options.read
  const log = structuredLog({
    level: options.logLevel,
    destination: io.stderr,
    redact: (text) => secrets.redact(text),
    now: io.now,
  })
  const feeds = recordedFeeds(options, (name, feed) => openFeed(name, feed, { now: io.now, log }))
  const ensembles = openEnsembles(settings)
  const drive = systemDrive(io.now, null)
  const totals = new Totals()
  const book = new ReportBook(new Map(ensembles.map(({ name, title }) => [name, title])))
  const writer = json ? new RecordWriter(io.stdout, every) : null
  const progress = new Progress(io, drive.lap)
  const stop = stopSignals()
  const started = drive.lap()
  const run = pipeline({
    feeds,
    ensembles,
    drive,
    sliceMs: longestSlice,
    stop: stop.asked,
    effects(outcome) {
      totals.take(outcome)
      book.take(outcome)
      progress.take(outcome)
      return writer?.outcome(outcome)
    },
  })
  try {
    await lastValueFrom(run, { defaultValue: null })
  } finally {
    progress.end()
    stop.release()
  }
  const summary = summaryRecord({
    readings: totals.readings,
    dropped: totals.dropped,
    frames: totals.frames,
    shifts: totals.shifts,
    findings: totals.findings,
    seconds: (drive.lap() - started) / 1000,
  })
  const report: RunReport = {
    summary,
    shifts: book.shifts,
    sentences: book.sentences,
    journal: book.journal,
    findings: book.findings,
    warnings: ensembles.flatMap(({ name, stepWarning }) =>
      stepWarning === null ? [] : [`${name}: ${stepWarning}`],
    ),
    cautions,
  }
  if (writer !== null) await writer.record(summary)
  else io.stdout.write(replayText(report))
  if (options.report !== null) writeReport(options.report, report)
  return expectSteady && totals.shifts > 0 ? 3 : 0
}

function recordedFeeds(
  { from, read: { settings } }: ReplayOptions,
  open: (name: string, feed: NonNullable<ReplayOptions['from']>['settings']) => Feed,
): Feed[] {
  if (from !== null) return [open(from.feed, from.settings)]
  const recorded = Object.entries(settings.feeds).filter(([, feed]) => !('kafka' in feed))
  if (recorded.length === 0) {
    throw new TautlineError(
      'usage',
      'The settings have no file feed to replay; give a recorded file with --from FILE.',
    )
  }
  return recorded.map(([name, feed]) => open(name, feed))
}

function writeReport(path: string, report: RunReport): void {
  try {
    writeFileSync(path, `${JSON.stringify(report, null, 2)}\n`)
  } catch (error) {
    throw new TautlineError('report-unwritten', `${path}: ${(error as NodeJS.ErrnoException).code}.`)
  }
}
