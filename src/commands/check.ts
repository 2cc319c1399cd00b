import type { Route } from '../alerts/route.ts'
import type { Result } from '../errors.ts'
import type { Feed } from '../feeds/feed.ts'
import { problemLines } from '../settings/problem.ts'
import type { FeedSettings, RouteSettings } from '../settings/schema.ts'
import { type CheckOptions, type ExitStatus, writeRecord } from './commands.ts'
import { tryFiles } from './try-files.ts'

/** How long a feed or a route may take to answer, in milliseconds, where its settings say nothing. */
const patienceMs = 15_000

/** What was tried, and how it went. */
export interface Tried {
  readonly what: 'settings' | 'file' | 'store' | 'feed' | 'route' | 'trial'
  readonly name: string
  readonly ok: boolean
  readonly detail: string
}

/** The ways in and out that the settings describe, opened but not started. */
export interface CheckParts {
  openFeed(name: string, settings: FeedSettings): Result<Pick<Feed, 'check'>>
  openRoute(name: string, settings: RouteSettings): Result<Pick<Route, 'check' | 'trial' | 'close'>>
}

/**
 * Tries files, store, feeds and routes at once and prints a table, or with `json` one `check` record for
 * each and a `summary`. Status 1 when one of them failed.
 */
export async function check(options: CheckOptions, parts: CheckParts): Promise<ExitStatus> {
  const { settings, warnings, secrets } = options.read
  const tried = [
    {
      what: 'settings',
      name: options.settingsPath,
      ok: true,
      detail: warningCount(warnings.length),
    } as const,
    ...tryFiles(settings),
    ...(
      await Promise.all([
        ...Object.entries(settings.feeds).map(([name, feed]) => tryFeed(name, feed, parts)),
        ...Object.entries(settings.routes).map(([name, route]) => tryRoute(name, route, parts, options)),
      ])
    ).flat(),
  ].map((one) => ({ ...one, detail: secrets.redact(one.detail) }))
  const failures = tried.filter(({ ok }) => !ok).length
  if (options.json) {
    for (const warning of warnings) writeRecord(options.io.stdout, { type: 'warning', ...warning })
    for (const one of tried) writeRecord(options.io.stdout, { type: 'check', ...one })
    writeRecord(options.io.stdout, {
      type: 'summary',
      tried: tried.length,
      failed: failures,
      warnings: warnings.length,
    })
  } else {
    for (const warning of warnings) options.io.stderr.write(`${problemLines(warning).join('\n')}\n`)
    options.io.stdout.write(`${table(tried)}\n${closing(tried.length, failures)}\n`)
  }
  return failures === 0 ? 0 : 1
}

const warningCount = (count: number) =>
  count === 0 ? 'read, nothing to remark' : `read, ${count} ${count === 1 ? 'warning' : 'warnings'}`

async function tryFeed(name: string, settings: FeedSettings, parts: CheckParts): Promise<Tried[]> {
  const opened = parts.openFeed(name, settings)
  if (!opened.ok) return [{ what: 'feed', name, ok: false, detail: opened.error.message }]
  return [{ what: 'feed', name, ...(await within(patienceMs, opened.value.check())) }]
}

async function tryRoute(
  name: string,
  settings: RouteSettings,
  parts: CheckParts,
  { trialAlert, io }: CheckOptions,
): Promise<Tried[]> {
  const opened = parts.openRoute(name, settings)
  if (!opened.ok) return [{ what: 'route', name, ok: false, detail: opened.error.message }]
  const route = opened.value
  const patience = settings.timeout + 1000
  const ask = (attempt: (signal: AbortSignal) => Promise<{ ok: boolean; detail: string }>) =>
    within(patience, attempt(AbortSignal.timeout(settings.timeout)))
  const tried: Tried[] = [{ what: 'route', name, ...(await ask((signal) => route.check(signal))) }]
  if (trialAlert)
    tried.push({ what: 'trial', name, ...(await ask((signal) => route.trial(io.now(), signal))) })
  await within(
    patience,
    route.close().then(() => ({ ok: true, detail: '' })),
  )
  return tried
}

/** The answer, or a failure where it does not come in time or the attempt itself breaks. */
async function within(
  ms: number,
  answer: Promise<{ readonly ok: boolean; readonly detail: string }>,
): Promise<{ ok: boolean; detail: string }> {
  let timer: NodeJS.Timeout | undefined
  const late = new Promise<{ ok: boolean; detail: string }>((resolve) => {
    timer = setTimeout(() => resolve({ ok: false, detail: `no answer within ${ms / 1000} s` }), ms)
  })
  try {
    const { ok, detail } = await Promise.race([answer, late])
    return { ok, detail }
  } catch (error) {
    return { ok: false, detail: error instanceof Error ? error.message : String(error) }
  } finally {
    clearTimeout(timer)
  }
}

function table(tried: readonly Tried[]): string {
  const width = Math.max(...tried.map(({ name }) => name.length))
  return tried
    .map(({ ok, what, name, detail }) =>
      `${ok ? 'ok    ' : 'FAILED'}  ${what.padEnd(8)}  ${name.padEnd(width)}  ${detail}`.trimEnd(),
    )
    .join('\n')
}

const closing = (tried: number, failures: number) =>
  failures === 0 ? `All ${tried} in order.` : `${failures} of ${tried} failed.`
