/**
 * One SQLite file. Every method that writes is one transaction, durable when it returns. Synchronous:
 * a write of a usual checkpoint takes about 2 ms.
 */
export interface Store {
  /** Runs `work`, whose writes become one transaction: all of them are durable afterwards, or none. */
  together<T>(work: () => T): T

  /** Replaces the checkpoint. Values are structured-clone-able (typed arrays allowed). */
  saveCheckpoint(checkpoint: Checkpoint): void
  loadCheckpoint(): Checkpoint | null

  /** Puts deliveries in the outbox; a delivery with the same key replaces one that has not been tried yet. */
  enqueue(deliveries: readonly Delivery[]): void
  /** Deliveries due at `now`: for each route and alert only the oldest, so that order per alert is kept. */
  due(now: number, limit: number): readonly Delivery[]
  settle(key: string, outcome: 'delivered' | 'given-up'): void
  retryAt(key: string, attempts: number, notBefore: number, lastError: string): void
  waiting(): number
  /** Ids of the alerts that have a delivery waiting for this route. */
  waitingAlerts(route: string): ReadonlySet<string>
  /** Makes everything that waits due at `now`: after the clock was set back, or on request. */
  hasten(now: number): void

  /** Appends to the journal. Append-only, but for the oldest of the kinds `delivery` and `run`, which give way. */
  journal(entries: readonly JournalEntry[]): void
  /** The newest `limit` (default 1000) entries that pass the filter, oldest first. */
  readJournal(filter: { ensemble?: string; kind?: string; limit?: number }): readonly JournalEntry[]

  /** The present version of each alert, for `explain`, the page and restarts. */
  saveAlert(id: string, alert: unknown): void
  alert(id: string): unknown | null
  /** Those saved last come first. Bounded: the oldest of the ended ones give way. */
  alerts(limit: number): readonly unknown[]

  /** Bounded: the oldest give way. */
  quarantine(records: readonly unknown[]): void
  /** Newest first. */
  readQuarantine(limit: number): readonly unknown[]

  close(): void
}

export interface Checkpoint {
  readonly version: number
  readonly savedAt: number
  /** Feed name → position. */
  readonly positions: Readonly<Record<string, Readonly<Record<string, string>>>>
  /** Ensemble name → snapshot of its rooms. */
  readonly ensembles: Readonly<Record<string, unknown>>
}

export interface Delivery {
  /** `ROUTE/ALERT-ID/VERSION`. */
  readonly key: string
  readonly route: string
  readonly alert: string
  readonly version: number
  readonly payload: unknown
  readonly created: number
  readonly attempts: number
  readonly notBefore: number
  /** After this moment the delivery is given up, and that is said. */
  readonly giveUpAt: number
  readonly lastError: string | null
}

export interface JournalEntry {
  readonly time: number
  readonly kind: 'transition' | 'shift' | 'ended' | 'act' | 'delivery' | 'run'
  readonly ensemble: string | null
  readonly body: unknown
}
