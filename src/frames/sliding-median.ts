/**
 * Exact median of the last `span` values: a ring in order of arrival beside the same values sorted. One
 * value in and one out costs two binary searches and two short moves.
 */
export class SlidingMedian {
  readonly #ring: Float64Array
  readonly #sorted: Float64Array
  #count = 0
  #next = 0
  #sumOfSquares = 0

  constructor(span: number) {
    this.#ring = new Float64Array(span)
    this.#sorted = new Float64Array(span)
  }

  get count(): number {
    return this.#count
  }

  /** `value` must be finite. */
  push(value: number): void {
    if (this.#count === this.#ring.length) this.#drop(this.#ring[this.#next]!)
    this.#ring[this.#next] = value
    this.#next = (this.#next + 1) % this.#ring.length
    const at = this.#place(value)
    this.#sorted.copyWithin(at + 1, at, this.#count)
    this.#sorted[at] = value
    this.#count++
    this.#sumOfSquares += value * value
  }

  /** 0 while empty. */
  get median(): number {
    const n = this.#count
    if (n === 0) return 0
    const middle = n >> 1
    return n % 2 === 1 ? this.#sorted[middle]! : (this.#sorted[middle - 1]! + this.#sorted[middle]!) / 2
  }

  /** 0 while empty or when all values are 0. */
  get rootMeanSquare(): number {
    return this.#count === 0 || this.#sorted[this.#count - 1] === 0
      ? 0
      : Math.sqrt(Math.max(0, this.#sumOfSquares) / this.#count)
  }

  #drop(value: number): void {
    const at = this.#place(value)
    this.#sorted.copyWithin(at, at + 1, this.#count)
    this.#count--
    this.#sumOfSquares -= value * value
  }

  /** First place whose value is not below `value`. */
  #place(value: number): number {
    let low = 0
    let high = this.#count
    while (low < high) {
      const middle = (low + high) >> 1
      if (this.#sorted[middle]! < value) low = middle + 1
      else high = middle
    }
    return low
  }

  snapshot(): SlidingMedianSnapshot {
    return {
      ring: this.#ring.slice(),
      count: this.#count,
      next: this.#next,
      sumOfSquares: this.#sumOfSquares,
    }
  }

  restore({ ring, count, next, sumOfSquares }: SlidingMedianSnapshot): void {
    this.#ring.set(ring)
    this.#count = count
    this.#next = next
    this.#sumOfSquares = sumOfSquares
    this.#sorted.set(ring)
    this.#sorted.subarray(0, count).sort()
  }
}

export interface SlidingMedianSnapshot {
  readonly ring: Float64Array
  readonly count: number
  readonly next: number
  readonly sumOfSquares: number
}

/** Median of the first `count` entries; reorders them. 0 for none. */
export function medianOf(values: Float64Array, count: number): number {
  if (count === 0) return 0
  const part = values.subarray(0, count).sort()
  const middle = count >> 1
  return count % 2 === 1 ? part[middle]! : (part[middle - 1]! + part[middle]!) / 2
}
