import { resolve } from 'node:path'
import { failed, ok, type Result, TautlineError } from '../errors.ts'
import type { FeedSettings, Settings } from '../settings/schema.ts'

/**
 * The feed that reads `path` (`-`: standard input) in place of the feeds of the settings: it takes name,
 * format and record limit of the feed `as`, which may be left out where all feeds agree. Fails with `usage`.
 */
export function replayFeed(
  settings: Settings,
  path: string,
  as: string | null,
): Result<{ readonly feed: string; readonly settings: FeedSettings }> {
  const names = Object.keys(settings.feeds)
  const fault = (detail: string) => failed(new TautlineError('usage', detail))
  if (as !== null && !names.includes(as))
    return fault(
      `--as ${as}: the settings have no feed of this name${names.length > 0 ? `, but ${names.join(', ')}` : ''}.`,
    )
  const formats = new Set(names.map((name) => JSON.stringify(settings.feeds[name]!.format)))
  if (as === null && formats.size > 1)
    return fault(
      `The feeds have different formats: name the one whose format the file has with --as (${names.join(', ')}).`,
    )
  const name = as ?? names[0]
  const like = name === undefined ? null : settings.feeds[name]!
  const shared = {
    format: like?.format ?? ('ndjson' as const),
    'max-record-bytes': like?.['max-record-bytes'] ?? 1024 * 1024,
  }
  return ok({
    feed: name ?? 'replay',
    settings: path === '-' ? { stdin: {}, ...shared } : { file: { path: resolve(path) }, ...shared },
  })
}
