/** One source of readings: a partition, a file. Times in milliseconds since 1970 UTC. */
export interface Source {
  /** Largest event time seen; -Infinity before the first reading. */
  latest: number
  caughtUp: boolean
  ended: boolean
  /** When it last spoke, by the clock of processing. */
  spoke: number
}

/**
 * How far event time has come: the least of the largest event times of all sources that are alive. A source
 * that has not spoken holds the clock; one that is read up to its end and has been silent for `idleAfter` no
 * longer does; one that has ended never does. With no source left alive, time rests where it was; when all
 * have ended it is +Infinity.
 */
export class Watermarks {
  readonly #idleAfter: number
  readonly #sources = new Map<string, Source>()
  #reached = Number.NEGATIVE_INFINITY

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

  remove(name: string): void {
    this.#sources.delete(name)
  }

  /** Largest event time that no living source can still come before (lateness not yet taken off). */
  reached(now: number): number {
    let least = Number.POSITIVE_INFINITY
    let alive = 0
    let ended = 0
    for (const source of this.#sources.values()) {
      if (source.ended) {
        ended++
        continue
      }
      if (source.caughtUp && now - source.spoke >= this.#idleAfter) continue
      alive++
      if (source.latest < least) least = source.latest
    }
    if (alive > 0) {
      if (least > this.#reached) this.#reached = least
    } else if (ended > 0 && ended === this.#sources.size) this.#reached = Number.POSITIVE_INFINITY
    return this.#reached
  }

  /** Sources and by how many milliseconds each runs ahead of the slowest living one. */
  *leads(now: number): Generator<readonly [name: string, lead: number]> {
    const floor = this.reached(now)
    for (const [name, { latest, ended }] of this.#sources) {
      if (!ended) yield [name, Number.isFinite(latest) ? Math.max(0, latest - floor) : 0]
    }
  }

  snapshot(): WatermarkSnapshot {
    return {
      reached: this.#reached,
      sources: [...this.#sources].map(([name, source]) => [name, { ...source }]),
    }
  }

  restore(snapshot: WatermarkSnapshot): void {
    this.#reached = snapshot.reached
    this.#sources.clear()
    for (const [name, source] of snapshot.sources) this.#sources.set(name, { ...source })
  }
}

export interface WatermarkSnapshot {
  readonly reached: number
  readonly sources: readonly (readonly [string, Source])[]
}
