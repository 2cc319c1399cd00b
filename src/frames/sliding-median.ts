/**
 * Exact median of the last `span` values: a ring in order of arrival beside the same values sorted. One
 * value in and one out costs two binary searches and two short moves.
 */
export class SlidingMedian {
  readonly #ring: Float64Array
  readonly #sorted: Float64Array
  #count = 0
  #next = 0

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
  }

  /** 0 while empty. */
  get median(): number {
    const n = this.#count
    if (n === 0) return 0
    const middle = n >> 1
    return n % 2 === 1 ? this.#sorted[middle]! : (this.#sorted[middle - 1]! + this.#sorted[middle]!) / 2
  }

  /** 0 while empty or when all values are 0. Summed afresh, so that no value leaves a trace behind it. */
  get rootMeanSquare(): number {
    if (this.#count === 0) return 0
    let sum = 0
    for (let i = 0; i < this.#count; i++) sum += this.#sorted[i]! ** 2
    return Math.sqrt(sum / this.#count)
  }

  #drop(value: number): void {
    const at = this.#place(value)
    this.#sorted.copyWithin(at, at + 1, this.#count)
    this.#count--
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
    return { ring: this.#ring.slice(), count: this.#count, next: this.#next }
  }

  restore({ ring, count, next }: SlidingMedianSnapshot): void {
    this.#ring.set(ring)
    this.#count = count
    this.#next = next
    this.#sorted.set(ring)
    this.#sorted.subarray(0, count).sort()
  }
}

export interface SlidingMedianSnapshot {
  readonly ring: Float64Array
  readonly count: number
  readonly next: number
}

/** Median of the first `count` entries; reorders them. 0 for none. Selection in linear time (Hoare 1961). */
export function medianOf(values: Float64Array, count: number): number {
  if (count === 0) return 0
  const middle = count >> 1
  const upper = select(values, count, middle)
  if (count % 2 === 1) return upper
  let lower = values[0]!
  for (let i = 1; i < middle; i++) if (values[i]! > lower) lower = values[i]!
  return (lower + upper) / 2
}

/** The entry of rank k, counted from 0, of the first `count`; smaller ones are left before it. */
function select(values: Float64Array, count: number, k: number): number {
  let low = 0
  let high = count - 1
  while (low < high) {
    const pivot = values[(low + high) >> 1]!
    let i = low
    let j = high
    while (i <= j) {
      while (values[i]! < pivot) i++
      while (values[j]! > pivot) j--
      if (i <= j) {
        const held = values[i]!
        values[i++] = values[j]!
        values[j--] = held
      }
    }
    if (k <= j) high = j
    else if (k >= i) low = i
    else break
  }
  return values[k]!
}
