import type { Point } from './view.ts'

const evidence = 8

/** How many points a history holds, and how many frames one of them stands for at most. */
export interface HistorySize {
  readonly points: number
  /** A power of two. */
  readonly coarsest: number
}

export const usualHistory: HistorySize = { points: 600, coarsest: 8 }

/**
 * The past of an ensemble in a bounded number of points. Each point is one judged frame as it was, never a
 * mean: of the frames that it stands for, the one with the most evidence. When the points run out, each two
 * neighbours become one, until a point stands for `coarsest` frames; from then on the oldest give way.
 */
export class History {
  readonly #size: HistorySize
  #points: Point[] = []
  #stride = 1
  #open: Point | null = null
  #inOpen = 0
  #more: Point[] = []
  #rewritten = false

  constructor(size: HistorySize = usualHistory) {
    this.#size = size
  }

  get points(): readonly Point[] {
    return this.#points
  }

  get stride(): number {
    return this.#stride
  }

  push(point: Point): void {
    this.#open = louder(this.#open, point)
    if (++this.#inOpen < this.#stride) return
    this.#points.push(this.#open)
    this.#more.push(this.#open)
    this.#open = null
    this.#inOpen = 0
    if (this.#points.length <= this.#size.points) return
    if (this.#stride >= this.#size.coarsest) this.#points.shift()
    else this.#halve()
    if (this.#more.length > this.#size.points) this.#rewrite()
  }

  /** What has come since the last call. `whole` where adding is not enough, or where there is too much to add. */
  taken(mostMore: number): { readonly more?: readonly Point[]; readonly whole?: readonly Point[] } {
    const whole = this.#rewritten || this.#more.length > mostMore
    const news = whole ? { whole: [...this.#points] } : this.#more.length > 0 ? { more: this.#more } : {}
    this.#more = []
    this.#rewritten = false
    return news
  }

  #halve(): void {
    const halved: Point[] = []
    let i = 0
    for (; i + 1 < this.#points.length; i += 2) halved.push(louder(this.#points[i]!, this.#points[i + 1]!))
    this.#open = this.#points[i] ?? null
    this.#inOpen = this.#open === null ? 0 : this.#stride
    this.#points = halved
    this.#stride *= 2
    this.#rewrite()
  }

  #rewrite(): void {
    this.#more = []
    this.#rewritten = true
  }
}

const louder = (a: Point | null, b: Point): Point =>
  a === null || (b[evidence] ?? -1) >= (a[evidence] ?? -1) ? b : a
