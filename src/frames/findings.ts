import type { FindingKind } from '../reasons.ts'
import { findingKinds } from '../reasons.ts'
import type { Finding } from './frame.ts'

/** Which findings are open: at most one of a kind and place. Beginnings and ends are news until they are read. */
export class FindingBook {
  /** Open kinds by place, a bit each. */
  #bits = new Uint8Array(0)
  #open = new Map<number, Finding>()
  #news: Finding[] = []

  reserve(places: number): void {
    if (this.#bits.length >= places) return
    const wider = new Uint8Array(places)
    wider.set(this.#bits)
    this.#bits = wider
  }

  isOpen(finding: FindingKind, place: number): boolean {
    return (this.#bits[place]! & bit[finding]) !== 0
  }

  begin(place: number, finding: Finding): void {
    this.#bits[place] = this.#bits[place]! | bit[finding.finding]
    this.#open.set(keyOf(finding.finding, place), finding)
    this.#news.push(finding)
  }

  end(finding: FindingKind, place: number, time: number): void {
    const key = keyOf(finding, place)
    const begun = this.#open.get(key)
    if (begun === undefined) return
    this.#bits[place] = this.#bits[place]! & ~bit[finding]
    this.#open.delete(key)
    this.#news.push({ ...begun, to: time })
  }

  /** One that is over when it is found. */
  tell(finding: Finding): void {
    this.#news.push(finding)
  }

  /** What began or ended since the last call. */
  news(): readonly Finding[] {
    if (this.#news.length === 0) return nothing
    const news = this.#news
    this.#news = []
    return news
  }

  snapshot(): FindingBookSnapshot {
    return { bits: this.#bits.slice(), open: [...this.#open], news: [...this.#news] }
  }

  restore({ bits, open, news }: FindingBookSnapshot): void {
    this.#bits = bits.slice()
    this.#open = new Map(open)
    this.#news = [...news]
  }
}

export interface FindingBookSnapshot {
  readonly bits: Uint8Array
  readonly open: readonly (readonly [number, Finding])[]
  readonly news: readonly Finding[]
}

const nothing: readonly Finding[] = []
const bit = Object.fromEntries(findingKinds.map((kind, k) => [kind, 1 << k])) as Record<FindingKind, number>
const keyOf = (finding: FindingKind, place: number): number => place * 8 + findingKinds.indexOf(finding)
