/** The last readings of all places within one step that is still open; -Infinity where there is none. */
export interface Step {
  /** Number of the step; with `row` its time. */
  readonly key: number
  /** The span of time [from, until) that belongs to it; with `row` both are its time. */
  readonly from: number
  readonly until: number
  /** Does all of it lie in one session? */
  readonly inSession: boolean
  time: Float64Array
  value: Float64Array
}

export interface StepSnapshot {
  readonly key: number
  readonly time: Float64Array
  readonly value: Float64Array
}

const mostSpare = 8
/** Places of steps that were taken away are cut off when they are so many, and half of all. */
const cutFrom = 256

/** Steps that wait to be closed, in the order of their keys, as columns over places. */
export class PendingSteps {
  readonly #mostSteps: number
  readonly #mostEntries: number
  readonly #shape: (key: number) => Pick<Step, 'from' | 'until' | 'inSession'>
  /** In the order of their keys from `#head` on; what is before it has been taken away. */
  #steps: Step[] = []
  #head = 0
  #spare: Step[] = []

  /** `shape` tells the span of a step. At most `mostSteps` wait, with `mostEntries` places over all of them. */
  constructor(
    mostSteps: number,
    mostEntries: number,
    shape: (key: number) => Pick<Step, 'from' | 'until' | 'inSession'>,
  ) {
    this.#mostSteps = mostSteps
    this.#mostEntries = mostEntries
    this.#shape = shape
  }

  get count(): number {
    return this.#steps.length - this.#head
  }

  get first(): Step | undefined {
    return this.#steps[this.#head]
  }

  /** Places that hold a reading, over all steps. */
  get readings(): number {
    let count = 0
    for (let s = this.#head; s < this.#steps.length; s++)
      for (const t of this.#steps[s]!.time) if (t > Number.NEGATIVE_INFINITY) count++
    return count
  }

  find(key: number): Step | undefined {
    const step = this.#steps[this.#rank(key)]
    return step?.key === key ? step : undefined
  }

  /** Waiting steps that begin after `from` and not after `until`. */
  countWithin(from: number, until: number): number {
    return this.#firstWhere((step) => step.from > until) - this.#firstWhere((step) => step.from > from)
  }

  /** A new, empty step, wide enough for `places`; null when no further one may wait. */
  open(key: number, places: number): Step | null {
    const count = this.count + 1
    if (count > this.#mostSteps || (count > 1 && count * places > this.#mostEntries)) return null
    const spare = this.#spare.pop()
    const step: Step = {
      key,
      ...this.#shape(key),
      time: spare?.time.fill(Number.NEGATIVE_INFINITY) ?? new Float64Array(0),
      value: spare?.value ?? new Float64Array(0),
    }
    this.widen(step, places)
    this.#steps.splice(this.#rank(key), 0, step)
    return step
  }

  widen(step: Step, places: number): void {
    if (step.time.length >= places) return
    step.time = lengthened(step.time, places, Number.NEGATIVE_INFINITY)
    step.value = lengthened(step.value, places, 0)
  }

  /** Takes the first step away; its columns may be used again after the next call of `open`. */
  shift(): Step | undefined {
    const step = this.#steps[this.#head]
    if (step === undefined) return undefined
    this.#head++
    if (
      this.#head === this.#steps.length ||
      (this.#head >= cutFrom && 2 * this.#head >= this.#steps.length)
    ) {
      this.#steps.splice(0, this.#head)
      this.#head = 0
    }
    if (this.#spare.length < mostSpare) this.#spare.push(step)
    return step
  }

  snapshot(): readonly StepSnapshot[] {
    const waiting = this.#steps.slice(this.#head)
    return waiting.map(({ key, time, value }) => ({ key, time: time.slice(), value: value.slice() }))
  }

  restore(steps: readonly StepSnapshot[]): void {
    this.#spare = []
    this.#head = 0
    this.#steps = steps.map(({ key, time, value }) => ({
      key,
      ...this.#shape(key),
      time: time.slice(),
      value: value.slice(),
    }))
  }

  /** Place of the step with this key, or where it would have to stand. */
  #rank(key: number): number {
    const count = this.#steps.length
    if (count === this.#head || this.#steps[count - 1]!.key < key) return count
    return this.#firstWhere((step) => step.key >= key)
  }

  #firstWhere(holds: (step: Step) => boolean): number {
    let low = this.#head
    let high = this.#steps.length
    while (low < high) {
      const middle = (low + high) >> 1
      if (holds(this.#steps[middle]!)) high = middle
      else low = middle + 1
    }
    return low
  }
}

/** A copy with room for `length` entries, `rest` in the new ones. */
export function lengthened(array: Float64Array, length: number, rest: number): Float64Array {
  const longer = new Float64Array(length).fill(rest)
  longer.set(array)
  return longer
}
