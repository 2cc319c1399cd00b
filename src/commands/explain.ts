import { existsSync, writeFileSync } from 'node:fs'
import type { Alert } from '../alerts/alert.ts'
import { TautlineError } from '../errors.ts'
import type { QuarantinedRecord } from '../feeds/feed.ts'
import type { ReferenceRecord } from '../regime/reference-record.ts'
import type { Transition } from '../regime/regime.ts'
import { openStore } from '../store/open-store.ts'
import type { Store } from '../store/store.ts'
import { type ExitStatus, type ExplainOptions, writeRecord } from './commands.ts'

/** How many alerts or records a list shows. */
const listed = 50
/** How many alerts are searched for a name. */
const searched = 10_000

export interface ExplainParts {
  /** The reference that the checkpoint of an ensemble holds; null while it is being learnt. */
  referenceOf(snapshot: unknown): ReferenceRecord | null
}

/** Shows from the store of the settings; the monitor may run meanwhile. Throws what the store throws. */
export async function explain(options: ExplainOptions, parts: ExplainParts): Promise<ExitStatus> {
  const {
    store: { path },
  } = options.read.settings
  if (!existsSync(path)) throw new TautlineError('store-missing', `${path} does not exist.`)
  const store = openStore(path)
  try {
    if (options.quarantine) showQuarantine(store, options)
    else if (options.reference !== null) writeReference(store, options, options.reference, parts)
    else if (options.subject === null) showList(store, options)
    else showAlert(findAlert(store, options.subject), store, options)
    return 0
  } finally {
    store.close()
  }
}

/** The alert of that id, or the newest of that ensemble or `ENSEMBLE/SHIFT`. Throws `nothing-to-explain`. */
function findAlert(store: Store, subject: string): Alert {
  const exact = store.alert(subject) as Alert | null
  if (exact !== null) return exact
  const all = store.alerts(searched) as readonly Alert[]
  const found = all
    .filter(({ id }) => id.startsWith(`${subject}/`))
    .reduce<Alert | null>(
      (newest, alert) => (newest === null || alert.raised > newest.raised ? alert : newest),
      null,
    )
  if (found === null) throw new TautlineError('nothing-to-explain', `There is no alert or regime ${subject}.`)
  return found
}

function writeReference(
  store: Store,
  { subject, io }: ExplainOptions,
  path: string,
  parts: ExplainParts,
): void {
  const snapshot = store.loadCheckpoint()?.ensembles[subject ?? '']
  const record = snapshot === undefined ? null : parts.referenceOf(snapshot)
  if (record === null)
    throw new TautlineError('nothing-to-explain', `The ensemble ${subject} has no reference yet.`)
  writeFileSync(path, `${JSON.stringify(record)}\n`)
  io.stderr.write(`The reference of ${subject}, ${record.names.length} signals, is in ${path}.\n`)
}

function showAlert(alert: Alert, store: Store, { io, json }: ExplainOptions): void {
  const transitions = store
    .readJournal({ ensemble: alert.ensemble, kind: 'transition' })
    .map(({ body }) => body as Transition)
    .filter(({ shift }) => shift !== null && shift === alert.shift?.number)
  if (json) writeRecord(io.stdout, { type: 'explanation', alert, transitions })
  else io.stdout.write(`${alertLines(alert, transitions).join('\n')}\n`)
}

function alertLines(alert: Alert, transitions: readonly Transition[]): string[] {
  const { shift } = alert
  const heading = (words: string) => ['', words]
  return [
    alert.sentence,
    '',
    `Alert ${alert.id}, ${alert.state.replaceAll('-', ' ')}${alert.ended === null ? '' : `, ended ${time(alert.ended)}`}${alert.trial ? ', a trial' : ''}`,
    ...alert.details,
    ...(shift === null
      ? []
      : [
          ...heading('Statistics beyond their limits'),
          ...shift.statistics.map(
            ({ statistic, value, limit }) =>
              `  ${statistic.padEnd(20)} ${figure(value)} over ${figure(limit)}`,
          ),
          ...heading('Who carries it (share of the movement)'),
          ...shift.carriers.map(({ signal, share }) => `  ${signal.padEnd(20)} ${figure(share)}`),
          `  ${'the rest'.padEnd(20)} ${figure(shift.remainder)}`,
          ...heading('Spectrum, largest first'),
          `  before  ${spectrum(shift.spectrumBefore)}`,
          `  after   ${spectrum(shift.spectrumAfter)}`,
        ]),
    ...(transitions.length === 0
      ? []
      : [
          ...heading('What the monitor did'),
          ...transitions.map(({ time: at, from, to, why }) => `  ${time(at)}  ${from} to ${to}: ${why}`),
        ]),
    ...heading('Cautions'),
    ...alert.cautions.map((caution) => `  ${caution}`),
    ...(alert.runbook === null ? [] : ['', `Runbook: ${alert.runbook}`]),
  ]
}

function showList(store: Store, { io, json }: ExplainOptions): void {
  const alerts = store.alerts(listed) as readonly Alert[]
  if (json) {
    for (const { id, state, ended, sentence } of alerts)
      writeRecord(io.stdout, {
        type: 'alert',
        id,
        state,
        ended: ended === null ? null : time(ended),
        sentence,
      })
    return
  }
  if (alerts.length === 0) io.stdout.write('No shift was confirmed so far.\n')
  for (const { id, state, sentence } of alerts)
    io.stdout.write(`${id}  ${state.replaceAll('-', ' ')}\n    ${sentence}\n`)
}

function showQuarantine(store: Store, { io, json }: ExplainOptions): void {
  const records = store.readQuarantine(json ? searched : listed) as readonly QuarantinedRecord[]
  if (json) {
    for (const record of records)
      writeRecord(io.stdout, { type: 'quarantined', ...record, at: time(record.at) })
    return
  }
  if (records.length === 0) io.stdout.write('Every record so far could be read.\n')
  for (const { at, feed, source, position, reason, detail, start } of records)
    io.stdout.write(`${time(at)}  ${feed}  ${source} at ${position}  ${reason}: ${detail}\n    ${start}\n`)
}

/** Milliseconds since 1970 UTC as RFC 3339. */
const time = (at: number): string => new Date(at).toISOString()

const figure = (value: number): string =>
  Number.isFinite(value) ? String(Number(value.toPrecision(4))) : 'not known'

const spectrum = (values: readonly number[]): string =>
  `${values.slice(0, 12).map(figure).join('  ')}${values.length > 12 ? `  … (${values.length})` : ''}`
