/** One source of readings: a partition, a file. Times in milliseconds since 1970 UTC. */
export interface Source {
  /** Largest event time seen; -Infinity before the first reading. */
  latest: number
  caughtUp: boolean
  ended: boolean
  /** When it last spoke or was assigned, by the clock of processing. */
  spoke: number
}

/**
 * How far event time has come: the least of the largest event times of all sources that are alive. A source
 * that has not spoken holds the clock; one that is read up to its end and has been silent for `idleAfter` no
 * longer does; one that has ended never does. With no source left alive, time rests where it was; when all
 * have ended it is +Infinity, until one comes alive again.
 */
export class Watermarks {
  readonly #idleAfter: number
  readonly #sources = new Map<string, Source>()
  #reached = Number.NEGATIVE_INFINITY
  #furthest = Number.NEGATIVE_INFINITY

  /** `idleAfter` in milliseconds of processing time. */
  constructor(idleAfter: number) {
    this.#idleAfter = idleAfter
  }

  /** The source of that name, made on first mention. */
  source(name: string, now: number): Source {
    const known = this.#sources.get(name)
    if (known !== undefined) return known
    const fresh: Source = { latest: Number.NEGATIVE_INFINITY, caughtUp: false, ended: false, spoke: now }
    this.#sources.set(name, fresh)
    return fresh
  }

  /** The source begins, or begins again after a restart: it holds the clock where it last was. */
  assign(name: string, now: number): void {
    const source = this.source(name, now)
    source.caughtUp = false
    source.ended = false
    source.spoke = now
  }

  remove(name: string): void {
    this.#sources.delete(name)
  }

  /** Largest event time that no living source can still come before (lateness not yet taken off). */
  reached(now: number): number {
    const least = this.#least(now, null)
    if (least !== null) this.#reached = Math.max(this.#reached, least)
    else if (this.#allEnded()) return Number.POSITIVE_INFINITY
    return this.#reached
  }

  /** Largest event time of any source so far; -Infinity before the first reading. */
  get furthest(): number {
    for (const { latest } of this.#sources.values()) if (latest > this.#furthest) this.#furthest = latest
    return this.#furthest
  }

  /** As `reached`, but of all sources other than this one; +Infinity when none of them holds the clock. */
  reachedByOthers(than: Source, now: number): number {
    return this.#least(now, than) ?? Number.POSITIVE_INFINITY
  }

  /** Names of all sources, each with its largest event time; ended ones are left out. */
  *living(): Generator<readonly [name: string, latest: number]> {
    for (const [name, { latest, ended }] of this.#sources) if (!ended) yield [name, latest]
  }

  #least(now: number, except: Source | null): number | null {
    let least = Number.POSITIVE_INFINITY
    let alive = false
    for (const source of this.#sources.values()) {
      if (source === except || source.ended) continue
      if (source.caughtUp && now - source.spoke >= this.#idleAfter) continue
      alive = true
      if (source.latest < least) least = source.latest
    }
    return alive ? least : null
  }

  #allEnded(): boolean {
    for (const { ended } of this.#sources.values()) if (!ended) return false
    return this.#sources.size > 0
  }

  snapshot(): WatermarkSnapshot {
    return {
      reached: this.#reached,
      furthest: this.furthest,
      sources: [...this.#sources].map(([name, source]) => [name, { ...source }]),
    }
  }

  restore(snapshot: WatermarkSnapshot): void {
    this.#reached = snapshot.reached
    this.#furthest = snapshot.furthest
    this.#sources.clear()
    for (const [name, source] of snapshot.sources) this.#sources.set(name, { ...source })
  }
}

export interface WatermarkSnapshot {
  readonly reached: number
  readonly furthest: number
  readonly sources: readonly (readonly [string, Source])[]
}
