/** Lags whose correlations are followed; the tail beyond them is taken as geometric. */
const mostLags = 20
/** Memory of the autocorrelations, in frames. */
const pull = 1 / 250
/** Pairs of values that an autocorrelation must rest on. */
const pairsWanted = 50
/** Products of correlations below this are noise of the means above. */
const noise = pull

/**
 * What a window of T frames is worth: the correlation of two series that are independent of each other has
 * the variance (1/T) Σ_k ρ_i(k) ρ_j(k) over all lags k (Bartlett 1935, 1946), so T_eff/T is one over the mean
 * of that sum over the pairs of signals. For a common AR(1) coefficient r it is (1 − r²)/(1 + r²).
 * Autocorrelations are exponential means over the last frames, about zero: increments have no level.
 */
export class EffectiveShare {
  /** The last frames, newest first, a row of signals each; NaN where missing. */
  #rows: Float64Array[] = []
  #square: Float64Array = new Float64Array(0)
  #squares: Float64Array = new Float64Array(0)
  /** By lag from 1, then by signal: mean of x_t x_{t−lag}, and on how many pairs it rests. */
  #lagged: Float64Array[] = []
  #pairs: Float64Array[] = []

  push(x: Float64Array, present: Uint8Array): void {
    this.#reserve(x.length)
    const row = (this.#rows.length > mostLags ? this.#rows.pop()! : new Float64Array(x.length)).fill(
      Number.NaN,
    )
    for (let i = 0; i < x.length; i++) {
      if (present[i] === 0) continue
      row[i] = x[i]!
      follow(this.#square, this.#squares, i, row[i]! * row[i]!)
    }
    for (let lag = 1; lag <= this.#rows.length && lag <= mostLags; lag++) {
      const before = this.#rows[lag - 1]!
      for (let i = 0; i < x.length; i++) {
        const product = row[i]! * before[i]!
        if (!Number.isNaN(product)) follow(this.#lagged[lag - 1]!, this.#pairs[lag - 1]!, i, product)
      }
    }
    this.#rows.unshift(row)
  }

  interrupt(): void {
    this.#rows = []
  }

  /** T_eff/T, in (0, 1]. The sum ends where two lags in a row show nothing but noise. */
  get value(): number {
    let sum = 0
    let first = 0
    let last = 0
    let quiet = 0
    for (let lag = 1; lag <= mostLags; lag++) {
      const product = this.#meanProduct(lag)
      if (product === null) break
      quiet = Math.abs(product) < noise ? quiet + 1 : 0
      if (quiet === 2) break
      if (lag === 1) first = product
      last = lag === mostLags ? product : 0
      sum += product
    }
    if (first > last && last > noise) {
      const ratio = Math.min(0.999, (last / first) ** (1 / (mostLags - 1)))
      sum += (last * ratio) / (1 - ratio)
    }
    return Math.min(1, 1 / (1 + 2 * Math.max(0, sum)))
  }

  /** Mean over the pairs of signals of ρ_i(lag) ρ_j(lag); null while too little is known. */
  #meanProduct(lag: number): number | null {
    const lagged = this.#lagged[lag - 1]
    const pairs = this.#pairs[lag - 1]
    if (lagged === undefined || pairs === undefined) return null
    let sum = 0
    let squares = 0
    let n = 0
    for (let i = 0; i < lagged.length; i++) {
      if (pairs[i]! < pairsWanted || !(this.#square[i]! > 0)) continue
      const r = Math.min(1, Math.max(-1, lagged[i]! / this.#square[i]!))
      sum += r
      squares += r * r
      n++
    }
    return n < 2 ? null : (sum * sum - squares) / (n * (n - 1))
  }

  #reserve(signals: number): void {
    if (this.#square.length >= signals) return
    const grow = (array: Float64Array, rest = 0): Float64Array => {
      const longer = new Float64Array(signals).fill(rest)
      longer.set(array)
      return longer
    }
    this.#rows = this.#rows.map((row) => grow(row, Number.NaN))
    this.#square = grow(this.#square)
    this.#squares = grow(this.#squares)
    this.#lagged = Array.from({ length: mostLags }, (_, k) => grow(this.#lagged[k] ?? new Float64Array(0)))
    this.#pairs = Array.from({ length: mostLags }, (_, k) => grow(this.#pairs[k] ?? new Float64Array(0)))
  }

  snapshot(): EffectiveShareSnapshot {
    return structuredClone({
      rows: this.#rows,
      square: this.#square,
      squares: this.#squares,
      lagged: this.#lagged,
      pairs: this.#pairs,
    })
  }

  restore(snapshot: EffectiveShareSnapshot): void {
    const s = structuredClone(snapshot)
    this.#rows = [...s.rows]
    this.#square = s.square
    this.#squares = s.squares
    this.#lagged = [...s.lagged]
    this.#pairs = [...s.pairs]
  }
}

export interface EffectiveShareSnapshot {
  readonly rows: readonly Float64Array[]
  readonly square: Float64Array
  readonly squares: Float64Array
  readonly lagged: readonly Float64Array[]
  readonly pairs: readonly Float64Array[]
}

/** An exponential mean that is the plain one at first. */
function follow(mean: Float64Array, count: Float64Array, i: number, value: number): void {
  count[i] = count[i]! + 1
  mean[i] = mean[i]! + Math.max(pull, 1 / count[i]!) * (value - mean[i]!)
}
