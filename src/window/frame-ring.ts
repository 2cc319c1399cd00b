/**
 * The last `capacity` frames, fixed memory: rows of values and of presence marks. The rows widen with the
 * roster; an older frame's new entries are missing.
 */
export class FrameRing {
  readonly capacity: number
  /** Widest frame seen: the length of the rows given out. */
  #roster = 0
  /** Room for a row, ahead of the roster so that not every new signal moves all rows. */
  #width = 0
  #length = 0
  #next = 0
  #values = new Float64Array(0)
  #present = new Uint8Array(0)

  constructor(capacity: number) {
    this.capacity = capacity
  }

  /** Frames held now. */
  get length(): number {
    return this.#length
  }

  get full(): boolean {
    return this.#length === this.capacity
  }

  /** Takes a copy of the frame; the oldest gives way when the ring is full. */
  push(x: Float64Array, present: Uint8Array): void {
    if (x.length > this.#width) this.#widen(Math.max(x.length, Math.ceil(1.25 * this.#width)))
    if (x.length > this.#roster) this.#roster = x.length
    const at = this.#next * this.#width
    this.#values.fill(0, at, at + this.#width)
    this.#present.fill(0, at, at + this.#width)
    this.#values.set(x, at)
    this.#present.set(present, at)
    this.#next = (this.#next + 1) % this.capacity
    if (this.#length < this.capacity) this.#length++
  }

  /** Values of the frame `ago` pushes back (0: the last), a view that the next push may overwrite. */
  values(ago: number): Float64Array {
    const at = this.#row(ago) * this.#width
    return this.#values.subarray(at, at + this.#roster)
  }

  /** Presence marks of the frame `ago` pushes back. */
  present(ago: number): Uint8Array {
    const at = this.#row(ago) * this.#width
    return this.#present.subarray(at, at + this.#roster)
  }

  clear(): void {
    this.#length = 0
    this.#next = 0
  }

  snapshot(): RingSnapshot {
    return {
      roster: this.#roster,
      width: this.#width,
      length: this.#length,
      next: this.#next,
      values: this.#values.slice(),
      present: this.#present.slice(),
    }
  }

  restore(s: RingSnapshot): void {
    this.#roster = s.roster
    this.#width = s.width
    this.#length = s.length
    this.#next = s.next
    this.#values = new Float64Array(s.values)
    this.#present = new Uint8Array(s.present)
  }

  #row(ago: number): number {
    return (this.#next - 1 - ago + 2 * this.capacity) % this.capacity
  }

  #widen(width: number): void {
    const values = new Float64Array(this.capacity * width)
    const present = new Uint8Array(this.capacity * width)
    for (let row = 0; row < this.#length; row++) {
      const at = row * this.#width
      values.set(this.#values.subarray(at, at + this.#width), row * width)
      present.set(this.#present.subarray(at, at + this.#width), row * width)
    }
    this.#width = width
    this.#values = values
    this.#present = present
  }
}

export interface RingSnapshot {
  readonly roster: number
  readonly width: number
  readonly length: number
  readonly next: number
  readonly values: Float64Array
  readonly present: Uint8Array
}
