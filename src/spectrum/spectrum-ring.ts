import type { Spectrum } from './spectrum.ts'

interface Kept {
  readonly active: Int32Array
  readonly spectrum: Spectrum
}

/**
 * The spectra of the last `span` windows, so that the one of so many frames ago need not be solved again.
 * Holds all eigenvalues and the leading vector of each.
 */
export class SpectrumRing {
  readonly #kept: (Kept | null)[]
  #next = 0

  constructor(span: number) {
    this.#kept = new Array<Kept | null>(span).fill(null)
  }

  /** The spectrum that is pushed out next, if it was of just these signals; else null. */
  oldest(active: Int32Array): Spectrum | null {
    const kept = this.#kept[this.#next] ?? null
    if (kept === null || kept.active.length !== active.length) return null
    for (let i = 0; i < active.length; i++) if (kept.active[i] !== active[i]) return null
    return kept.spectrum
  }

  push(active: Int32Array, spectrum: Spectrum | null): void {
    this.#kept[this.#next] =
      spectrum === null ? null : { active: active.slice(), spectrum: leadingOnly(spectrum) }
    this.#next = (this.#next + 1) % this.#kept.length
  }

  snapshot(): unknown {
    return structuredClone({ kept: this.#kept, next: this.#next })
  }

  restore(snapshot: unknown): void {
    const { kept, next } = structuredClone(snapshot) as { kept: (Kept | null)[]; next: number }
    for (const [k, one] of kept.entries()) this.#kept[k] = one
    this.#next = next
  }
}

const leadingOnly = ({ n, values, vectors, age, bound }: Spectrum): Spectrum => ({
  n,
  values: values.slice(),
  modes: 1,
  vectors: vectors.slice(0, n),
  age,
  bound,
})
