import { truncationCertificate } from './certificate.ts'
import type { Window } from './window.ts'

/**
 * The window of the truncated frames (Ĉ) and, as long as a clipped frame lies in it, its twin of the same
 * frames before truncation (C). Without a clipped frame the two are one and the certificate is exactly 0.
 */
export class TwinWindow {
  /** The window of the cleaned frames: what everything downstream is computed from. */
  readonly cleaned: Window
  #make: () => Window
  #twin: Window | null = null
  #sinceClipped = 0
  #scratch = new Float64Array(0)

  /** `make` gives an empty window; it is called once now and once for every spell with clipped frames. */
  constructor(make: () => Window) {
    this.#make = make
    this.cleaned = make()
  }

  /** `clipped`: how many entries of the frame were clipped; with 0, `scaled` and `cleaned` are equal. */
  push(scaled: Float64Array, cleaned: Float64Array, present: Uint8Array, clipped: number): void {
    this.#sinceClipped = clipped > 0 ? 0 : this.#sinceClipped + 1
    if (clipped > 0 && this.#twin === null) {
      this.#twin = this.#make()
      this.#twin.restore(this.cleaned.snapshot())
    }
    this.cleaned.push(cleaned, present)
    if (this.#sinceClipped >= this.cleaned.memory) this.#twin = null
    this.#twin?.push(scaled, present)
  }

  /** The window before truncation; the cleaned one itself while no clipped frame lies in it. */
  get scaled(): Window {
    return this.#twin ?? this.cleaned
  }

  /** Does a clipped frame lie in the window? */
  get twinned(): boolean {
    return this.#twin !== null
  }

  /**
   * ‖C − Ĉ‖_F/√n for the given Ĉ (n × n, of the signals `active`) in correlation, or in covariance when
   * the fixed `scales` by roster index are given.
   */
  certificate(matrix: Float64Array, active: Int32Array, scales?: Float64Array): number {
    if (this.#twin === null) return 0
    const n = active.length
    if (this.#scratch.length !== n * n) this.#scratch = new Float64Array(n * n)
    if (scales === undefined) this.#twin.correlation(this.#scratch, active)
    else this.#twin.covariance(this.#scratch, active, scales)
    return truncationCertificate(this.#scratch, matrix, n)
  }

  snapshot(): unknown {
    return {
      cleaned: this.cleaned.snapshot(),
      twin: this.#twin?.snapshot() ?? null,
      sinceClipped: this.#sinceClipped,
    } satisfies TwinSnapshot
  }

  restore(snapshot: unknown): void {
    const s = snapshot as TwinSnapshot
    this.cleaned.restore(s.cleaned)
    this.#sinceClipped = s.sinceClipped
    this.#twin = null
    if (s.twin !== null) {
      this.#twin = this.#make()
      this.#twin.restore(s.twin)
    }
  }
}

interface TwinSnapshot {
  readonly cleaned: unknown
  readonly twin: unknown
  readonly sinceClipped: number
}
