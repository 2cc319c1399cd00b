import { mkdirSync, renameSync } from 'node:fs'
import { dirname } from 'node:path'
import Database from 'libsql'
import { TautlineError } from '../errors.ts'
import { applicationId, migrations, schemaVersion } from './schema.ts'
import { type Bounds, defaultBounds, SqliteStore } from './sqlite-store.ts'

/** Milliseconds that a write waits for another process (such as `tautline explain`) to let go of the file. */
const busyTimeoutMs = 5000
/** Bytes to which the write-ahead log is cut back after it was emptied. */
const logBytes = 16 * 1024 * 1024

/**
 * Opens or makes the store at `path`; `:memory:` gives one that lives as long as the process. Throws
 * `store-unopened`, `store-foreign`, `store-damaged` or `store-newer`, and then leaves the file as it is:
 * `setAside` moves it out of the way when the caller decides so.
 */
export function openStore(path: string, bounds: Partial<Bounds> = {}): SqliteStore {
  const database = connect(path)
  try {
    prepare(database, path)
    return new SqliteStore(database, { ...defaultBounds, ...bounds })
  } catch (error) {
    database.close()
    throw coded(error, path)
  }
}

/**
 * Renames a store that cannot be used, with its companions, to `PATH.aside-TIME` and returns the new name.
 * `now` in milliseconds since 1970 UTC.
 */
export function setAside(path: string, now: number): string {
  const aside = `${path}.aside-${new Date(now).toISOString().replaceAll(/[:.]/g, '-')}`
  renameSync(path, aside)
  for (const companion of ['-wal', '-shm'])
    try {
      renameSync(path + companion, aside + companion)
    } catch (error) {
      if ((error as NodeJS.ErrnoException).code !== 'ENOENT') throw error
    }
  return aside
}

function connect(path: string): Database.Database {
  try {
    if (path !== ':memory:') mkdirSync(dirname(path), { recursive: true })
    return new Database(path, { timeout: busyTimeoutMs })
  } catch (cause) {
    throw new TautlineError('store-unopened', `${path}: ${words(cause)}`, { cause })
  }
}

function prepare(database: Database.Database, path: string): void {
  const version = readNumber(database, 'user_version')
  const owner = readNumber(database, 'application_id')
  const tables = database.prepare('SELECT count(*) AS n FROM sqlite_schema').get([]) as { n: number }
  if (owner !== applicationId && (owner !== 0 || version !== 0 || tables.n > 0))
    throw new TautlineError('store-foreign', path)
  if (version > schemaVersion)
    throw new TautlineError(
      'store-newer',
      `${path}: schema ${version}; this version knows up to ${schemaVersion}.`,
    )
  const check = database.prepare('PRAGMA quick_check(1)').get([]) as { quick_check: string }
  if (check.quick_check !== 'ok') throw new TautlineError('store-damaged', `${path}: ${check.quick_check}`)

  database.exec(
    `PRAGMA journal_mode = WAL; PRAGMA synchronous = FULL; PRAGMA journal_size_limit = ${logBytes}`,
  )
  if (version === schemaVersion) return
  database.exec('BEGIN IMMEDIATE')
  // Another process may have done the same meanwhile.
  for (const step of migrations.slice(readNumber(database, 'user_version'))) database.exec(step)
  database.exec(`PRAGMA application_id = ${applicationId}; PRAGMA user_version = ${schemaVersion}; COMMIT`)
}

function readNumber(database: Database.Database, pragma: 'user_version' | 'application_id'): number {
  const row = database.prepare(`PRAGMA ${pragma}`).get([]) as Record<string, number>
  return row[pragma] ?? 0
}

function coded(error: unknown, path: string): TautlineError {
  if (error instanceof TautlineError) return error
  const sqlite = error instanceof Database.SqliteError ? error.code : ''
  const detail = `${path}: ${words(error)}`
  if (sqlite.startsWith('SQLITE_NOTADB')) return new TautlineError('store-foreign', path, { cause: error })
  if (sqlite.startsWith('SQLITE_CORRUPT')) return new TautlineError('store-damaged', detail, { cause: error })
  return new TautlineError('store-unopened', detail, { cause: error })
}

const words = (error: unknown): string => (error instanceof Error ? error.message : String(error)).trim()
