/** Smallest of a set of numbers at hand: a binary heap. Each number is pushed at most once. */
export class KeyHeap {
  #keys: number[] = []

  get size(): number {
    return this.#keys.length
  }

  /** +Infinity when empty. */
  get least(): number {
    return this.#keys[0] ?? Number.POSITIVE_INFINITY
  }

  push(key: number): void {
    const keys = this.#keys
    let at = keys.push(key) - 1
    while (at > 0) {
      const parent = (at - 1) >> 1
      if (keys[parent]! <= key) break
      keys[at] = keys[parent]!
      at = parent
    }
    keys[at] = key
  }

  /** Takes the smallest out. */
  pop(): void {
    const keys = this.#keys
    const last = keys.pop()
    if (last === undefined || keys.length === 0) return
    let at = 0
    for (;;) {
      let child = 2 * at + 1
      if (child >= keys.length) break
      if (child + 1 < keys.length && keys[child + 1]! < keys[child]!) child++
      if (keys[child]! >= last) break
      keys[at] = keys[child]!
      at = child
    }
    keys[at] = last
  }

  clear(): void {
    this.#keys = []
  }
}
