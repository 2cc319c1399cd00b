import type Database from 'libsql'
import { prunableKinds } from './schema.ts'
import { seal, unseal } from './sealed.ts'
import type { Checkpoint, Delivery, JournalEntry, Store } from './store.ts'

/** How many rows of each kind are kept; the oldest give way. */
export interface Bounds {
  readonly quarantine: number
  /** Alerts that have ended. Those that have not are kept, one or few per ensemble. */
  readonly endedAlerts: number
  /** Journal entries of the kinds `delivery` and `run`, together. */
  readonly prunableEntries: number
}

export const defaultBounds: Bounds = { quarantine: 1000, endedAlerts: 1000, prunableEntries: 10_000 }

interface OutboxRow {
  readonly key: string
  readonly route: string
  readonly alert: string
  readonly version: number
  readonly payload: string
  readonly created: number
  readonly attempts: number
  readonly not_before: number
  readonly give_up_at: number
  readonly last_error: string | null
}

/**
 * The store over one SQLite connection. Growth: the checkpoint is one row; outbox rows leave within their
 * route's give-up time; alerts, quarantine and the prunable journal kinds are bounded by count; what is left
 * of the journal (transitions, shifts, ends, acts) is kept for good and grows with the number of regimes,
 * about one kilobyte for each beside what the caller puts in the bodies.
 *
 * Values are bound as text, number, null or bytes only: the driver ends the process at a boolean.
 */
export class SqliteStore implements Store {
  readonly #database: Database.Database
  readonly #bounds: Bounds
  readonly #statements = new Map<string, Database.Statement<unknown[]>>()
  #inside = false

  constructor(database: Database.Database, bounds: Bounds) {
    this.#database = database
    this.#bounds = bounds
  }

  together<T>(work: () => T): T {
    if (this.#inside) return work()
    this.#database.exec('BEGIN IMMEDIATE')
    this.#inside = true
    try {
      const result = work()
      this.#database.exec('COMMIT')
      return result
    } catch (error) {
      if (this.#database.inTransaction) this.#database.exec('ROLLBACK')
      throw error
    } finally {
      this.#inside = false
    }
  }

  saveCheckpoint(checkpoint: Checkpoint): void {
    this.#run(
      `INSERT INTO checkpoint (only, saved_at, sealed) VALUES (1, ?, ?)
       ON CONFLICT DO UPDATE SET saved_at = excluded.saved_at, sealed = excluded.sealed`,
      checkpoint.savedAt,
      seal(checkpoint),
    )
  }

  /** Throws `checkpoint-unreadable` for a checkpoint that was damaged or written in another format. */
  loadCheckpoint(): Checkpoint | null {
    const row = this.#get<{ sealed: ArrayBuffer | Uint8Array }>('SELECT sealed FROM checkpoint')
    return row === undefined ? null : (unseal(Buffer.from(row.sealed as Uint8Array)) as Checkpoint)
  }

  enqueue(deliveries: readonly Delivery[]): void {
    this.together(() => {
      for (const delivery of deliveries)
        this.#run(
          `INSERT INTO outbox VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?)
           ON CONFLICT (key) DO UPDATE SET payload = excluded.payload, created = excluded.created,
             not_before = excluded.not_before, give_up_at = excluded.give_up_at
           WHERE outbox.attempts = 0`,
          delivery.key,
          delivery.route,
          delivery.alert,
          delivery.version,
          delivery.created,
          delivery.attempts,
          delivery.notBefore,
          delivery.giveUpAt,
          delivery.lastError,
          toJson(delivery.payload),
        )
    })
  }

  /** Routes take turns, so that a route with much that waits leaves room for the others within `limit`. */
  due(now: number, limit: number): readonly Delivery[] {
    return this.#all<OutboxRow>(
      `SELECT outbox.* FROM (
         SELECT key AS due, row_number() OVER (PARTITION BY route ORDER BY not_before, created, key) AS turn
         FROM outbox AS o
         WHERE not_before <= ? AND NOT EXISTS (
           SELECT 1 FROM outbox AS earlier
           WHERE earlier.route = o.route AND earlier.alert = o.alert AND earlier.version < o.version)
         ORDER BY turn, not_before, created, key LIMIT ?)
       JOIN outbox ON outbox.key = due ORDER BY turn, not_before, created, key`,
      now,
      limit,
    ).map(toDelivery)
  }

  settle(key: string, _outcome: 'delivered' | 'given-up'): void {
    this.#run('DELETE FROM outbox WHERE key = ?', key)
  }

  retryAt(key: string, attempts: number, notBefore: number, lastError: string): void {
    this.#run(
      'UPDATE outbox SET attempts = ?, not_before = ?, last_error = ? WHERE key = ?',
      attempts,
      notBefore,
      lastError,
      key,
    )
  }

  waiting(): number {
    return this.#get<{ n: number }>('SELECT count(*) AS n FROM outbox')?.n ?? 0
  }

  waitingAlerts(route: string): ReadonlySet<string> {
    const rows = this.#all<{ alert: string }>('SELECT DISTINCT alert FROM outbox WHERE route = ?', route)
    return new Set(rows.map(({ alert }) => alert))
  }

  hasten(now: number): void {
    this.#run('UPDATE outbox SET not_before = ? WHERE not_before > ?', now, now)
  }

  journal(entries: readonly JournalEntry[]): void {
    if (entries.length === 0) return
    this.together(() => {
      for (const { time, kind, ensemble, body } of entries)
        this.#run(
          'INSERT INTO journal (time, kind, ensemble, body) VALUES (?, ?, ?, ?)',
          time,
          kind,
          ensemble,
          toJson(body),
        )
      const kinds = prunableKinds.map((kind) => `'${kind}'`).join(', ')
      this.#run(
        `DELETE FROM journal WHERE kind IN (${kinds}) AND seq <= (
           SELECT seq FROM journal WHERE kind IN (${kinds}) ORDER BY seq DESC LIMIT 1 OFFSET ?)`,
        this.#bounds.prunableEntries,
      )
    })
  }

  readJournal(filter: { ensemble?: string; kind?: string; limit?: number }): readonly JournalEntry[] {
    const rows = this.#all<{ time: number; kind: string; ensemble: string | null; body: string }>(
      `SELECT time, kind, ensemble, body FROM journal
       WHERE (?1 IS NULL OR ensemble = ?1) AND (?2 IS NULL OR kind = ?2) ORDER BY seq DESC LIMIT ?3`,
      filter.ensemble ?? null,
      filter.kind ?? null,
      filter.limit ?? 1000,
    )
    return rows.reverse().map(({ time, kind, ensemble, body }) => ({
      time,
      kind: kind as JournalEntry['kind'],
      ensemble,
      body: JSON.parse(body),
    }))
  }

  saveAlert(id: string, alert: unknown): void {
    const open = (alert as { ended?: unknown } | null)?.ended === null ? 1 : 0
    this.together(() => {
      this.#run(
        `INSERT INTO alert (id, saved, open, body)
         VALUES (?1, (SELECT coalesce(max(saved), 0) + 1 FROM alert), ?2, ?3)
         ON CONFLICT (id) DO UPDATE SET saved = excluded.saved, open = excluded.open, body = excluded.body`,
        id,
        open,
        toJson(alert),
      )
      this.#run(
        `DELETE FROM alert WHERE open = 0 AND saved <= (
           SELECT saved FROM alert WHERE open = 0 ORDER BY saved DESC LIMIT 1 OFFSET ?)`,
        this.#bounds.endedAlerts,
      )
    })
  }

  alert(id: string): unknown | null {
    const row = this.#get<{ body: string }>('SELECT body FROM alert WHERE id = ?', id)
    return row === undefined ? null : JSON.parse(row.body)
  }

  alerts(limit: number): readonly unknown[] {
    return this.#all<{ body: string }>('SELECT body FROM alert ORDER BY saved DESC LIMIT ?', limit).map(
      ({ body }) => JSON.parse(body),
    )
  }

  quarantine(records: readonly unknown[]): void {
    if (records.length === 0) return
    this.together(() => {
      // Of more records than are kept, only the last are written.
      for (const record of records.slice(-this.#bounds.quarantine))
        this.#run('INSERT INTO quarantine (body) VALUES (?)', toJson(record))
      this.#run(
        'DELETE FROM quarantine WHERE seq <= (SELECT max(seq) FROM quarantine) - ?',
        this.#bounds.quarantine,
      )
    })
  }

  readQuarantine(limit: number): readonly unknown[] {
    return this.#all<{ body: string }>('SELECT body FROM quarantine ORDER BY seq DESC LIMIT ?', limit).map(
      ({ body }) => JSON.parse(body),
    )
  }

  close(): void {
    if (!this.#database.open) return
    this.#statements.clear()
    // The driver lets go of the file only with its last statement, so the log is emptied here.
    try {
      this.#database.exec('PRAGMA wal_checkpoint(TRUNCATE)')
    } finally {
      this.#database.close()
    }
  }

  #statement(sql: string): Database.Statement<unknown[]> {
    if (!this.#database.open) throw new Error('the store is closed')
    const known = this.#statements.get(sql)
    if (known !== undefined) return known
    const prepared = this.#database.prepare(sql)
    this.#statements.set(sql, prepared)
    return prepared
  }

  #run(sql: string, ...values: readonly Bindable[]): void {
    this.#statement(sql).run([...values])
  }

  #get<Row>(sql: string, ...values: readonly Bindable[]): Row | undefined {
    return this.#statement(sql).get([...values]) as Row | undefined
  }

  #all<Row>(sql: string, ...values: readonly Bindable[]): Row[] {
    return this.#statement(sql).all([...values]) as Row[]
  }
}

type Bindable = string | number | null | Uint8Array

const toJson = (value: unknown): string => JSON.stringify(value) ?? 'null'

const toDelivery = (row: OutboxRow): Delivery => ({
  key: row.key,
  route: row.route,
  alert: row.alert,
  version: row.version,
  payload: JSON.parse(row.payload),
  created: row.created,
  attempts: row.attempts,
  notBefore: row.not_before,
  giveUpAt: row.give_up_at,
  lastError: row.last_error,
})
