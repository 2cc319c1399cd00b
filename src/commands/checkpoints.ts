import { createHash } from 'node:crypto'
import type { Ensemble } from '../ensemble.ts'
import { TautlineError } from '../errors.ts'
import type { Feed, FeedEvent, Position } from '../feeds/feed.ts'
import type { Log } from '../observe/log.ts'
import type { Settings } from '../settings/schema.ts'
import type { Store } from '../store/store.ts'

const checkpointVersion = 1

/** State of one ensemble as the checkpoint keeps it, with a mark of the settings that it belongs to. */
export interface KeptEnsemble {
  readonly settings: string
  readonly state: unknown
}

/**
 * Saves the whole state of the house with the positions of its feeds in one transaction, and then lets the
 * feeds commit: what was read is never ahead of what was kept.
 */
export class Checkpoints {
  readonly #store: Store
  readonly #settings: Settings
  readonly #positions = new Map<string, Position>()
  #savedAt: number

  constructor(store: Store, settings: Settings, now: number) {
    this.#store = store
    this.#settings = settings
    this.#savedAt = now
  }

  get savedAt(): number {
    return this.#savedAt
  }

  /** Positions of the last run, by feed; an ensemble whose settings have changed starts afresh and says so. */
  restore(ensembles: readonly Ensemble[], log: Log): ReadonlyMap<string, Position> {
    const checkpoint = this.#load(log)
    if (checkpoint === null) return this.#positions
    for (const [feed, position] of Object.entries(checkpoint.positions)) this.#positions.set(feed, position)
    for (const ensemble of ensembles) {
      const kept = checkpoint.ensembles[ensemble.name] as KeptEnsemble | undefined
      if (kept === undefined) continue
      if (kept.settings === this.#mark(ensemble.name)) ensemble.restore(kept.state)
      else
        log('warn', 'The settings of the ensemble have changed: it starts afresh.', {
          ensemble: ensemble.name,
        })
    }
    return this.#positions
  }

  /** Remembers how far a feed has been taken in. */
  advance(feed: string, event: FeedEvent): void {
    if (event.type !== 'batch') return
    this.#positions.set(feed, { ...this.#positions.get(feed), ...event.position })
  }

  /** @throws what the store throws */
  async save(ensembles: readonly Ensemble[], feeds: readonly Feed[], now: number): Promise<void> {
    this.#store.saveCheckpoint({
      version: checkpointVersion,
      savedAt: now,
      positions: Object.fromEntries(this.#positions),
      ensembles: Object.fromEntries(
        ensembles.map((ensemble) => [
          ensemble.name,
          { settings: this.#mark(ensemble.name), state: ensemble.snapshot() } satisfies KeptEnsemble,
        ]),
      ),
    })
    this.#savedAt = now
    for (const feed of feeds) {
      const position = this.#positions.get(feed.name)
      if (position !== undefined) await feed.commit(position)
    }
  }

  #load(log: Log) {
    try {
      const checkpoint = this.#store.loadCheckpoint()
      return checkpoint?.version === checkpointVersion ? checkpoint : null
    } catch (error) {
      if (!(error instanceof TautlineError)) throw error
      log('warn', error.message, { code: error.code, remedy: error.remedy })
      return null
    }
  }

  #mark(ensemble: string): string {
    const { title: _title, runbook: _runbook, ...meaning } = this.#settings.ensembles[ensemble] ?? {}
    return createHash('sha256').update(JSON.stringify(meaning)).digest('hex')
  }
}
