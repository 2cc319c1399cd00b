import { matchesGlob } from './glob.ts'

export type SignalChoice =
  | { readonly names: readonly string[] }
  | { readonly pattern: string; readonly limit: number }

/** What becomes of a signal's readings: its place, or why it has none. */
export const unwatched = -1
export const overLimit = -2

/**
 * The signals of an ensemble. A signal has two numbers: its *place*, given when its first reading arrives,
 * by which readings are kept until their frame closes; and its *index* in every frame, given when a frame
 * first holds it. New signals of one frame are numbered by name, so that indices depend on the readings
 * alone and not on the order in which they arrived. An explicit list has both from the start.
 */
export class Roster {
  /** Names by index. Grows, never shrinks. */
  readonly names: string[] = []
  readonly #choice: SignalChoice
  #placeNames: string[] = []
  #placeOf = new Map<string, number>()
  #indexOf: number[] = []
  #placeAt: number[] = []

  constructor(choice: SignalChoice) {
    this.#choice = choice
    if ('names' in choice) for (const name of new Set(choice.names)) this.#number(this.#newPlace(name))
  }

  get places(): number {
    return this.#placeNames.length
  }

  watches(name: string): boolean {
    return 'names' in this.#choice ? this.#placeOf.has(name) : matchesGlob(this.#choice.pattern, name)
  }

  /** The place of a signal, made on first sight; `unwatched` or `overLimit` (both negative) where it has none. */
  place(name: string): number {
    const known = this.#placeOf.get(name)
    if (known !== undefined) return known
    if (!this.watches(name)) return unwatched
    const limit = 'names' in this.#choice ? 0 : this.#choice.limit
    return this.places < limit ? this.#newPlace(name) : overLimit
  }

  nameOf(place: number): string {
    return this.#placeNames[place] ?? ''
  }

  /** Index in frames of the signal at this place, or -1 while no frame has held it. */
  index(place: number): number {
    return this.#indexOf[place]!
  }

  /** Place of the signal with this index. */
  placeAt(index: number): number {
    return this.#placeAt[index]!
  }

  /** Numbers signals that a frame holds for the first time, in the order of their names. */
  enrol(places: readonly number[]): void {
    const byName = [...places].sort((a, b) => (this.nameOf(a) < this.nameOf(b) ? -1 : 1))
    for (const place of byName) this.#number(place)
  }

  snapshot(): RosterSnapshot {
    return { placeNames: [...this.#placeNames], placeAt: [...this.#placeAt] }
  }

  restore({ placeNames, placeAt }: RosterSnapshot): void {
    this.#placeNames = []
    this.#placeOf = new Map()
    this.#indexOf = []
    this.#placeAt = []
    this.names.length = 0
    for (const name of placeNames) this.#newPlace(name)
    for (const place of placeAt) this.#number(place)
  }

  #number(place: number): void {
    this.#indexOf[place] = this.names.push(this.nameOf(place)) - 1
    this.#placeAt.push(place)
  }

  #newPlace(name: string): number {
    const place = this.#placeNames.push(name) - 1
    this.#indexOf[place] = -1
    this.#placeOf.set(name, place)
    return place
  }
}

export interface RosterSnapshot {
  readonly placeNames: readonly string[]
  readonly placeAt: readonly number[]
}
