/** Frames as plain numbers; null is a missing entry. */
export type Row = readonly (number | null)[]

export const valuesOf = (row: Row): Float64Array => Float64Array.from(row, (v) => v ?? 0)
export const presentOf = (row: Row): Uint8Array => Uint8Array.from(row, (v) => (v === null ? 0 : 1))

/** Weighted Pearson correlation by the textbook's two passes; gaps stand at the signal's mean. */
export function batchCorrelation(rows: readonly Row[], weights: readonly number[], n: number): Float64Array {
  const column = (i: number): (number | null)[] => rows.map((row) => row[i] ?? null)
  const centred = Array.from({ length: n }, (_, i) => {
    let sum = 0
    let weight = 0
    column(i).forEach((v, t) => {
      if (v === null) return
      sum += weights[t]! * v
      weight += weights[t]!
    })
    return column(i).map((v) => (v === null ? 0 : v - sum / weight))
  })
  const dot = (i: number, j: number): number =>
    weights.reduce((s, w, t) => s + w * centred[i]![t]! * centred[j]![t]!, 0)
  const out = new Float64Array(n * n)
  for (let i = 0; i < n; i++) {
    for (let j = 0; j < n; j++) {
      const scale = Math.sqrt(dot(i, i) * dot(j, j))
      out[i * n + j] = i === j ? 1 : scale > 0 ? dot(i, j) / scale : 0
    }
  }
  return out
}

/** Batch variance of each signal over its present entries. */
export function batchVariance(rows: readonly Row[], weights: readonly number[], i: number): number {
  let sum = 0
  let weight = 0
  rows.forEach((row, t) => {
    const v = row[i] ?? null
    if (v === null) return
    sum += weights[t]! * v
    weight += weights[t]!
  })
  if (weight === 0) return 0
  let squares = 0
  rows.forEach((row, t) => {
    const v = row[i] ?? null
    if (v !== null) squares += weights[t]! * (v - sum / weight) ** 2
  })
  return squares / weight
}

export function largestDifference(a: Float64Array, b: Float64Array): number {
  let largest = 0
  a.forEach((v, k) => {
    largest = Math.max(largest, Math.abs(v - b[k]!))
  })
  return largest
}

/** Deterministic standard normal numbers (Box & Muller 1958) from a small seeded generator. */
export function normals(seed: number): () => number {
  let state = seed >>> 0
  const uniform = (): number => {
    state = (state + 0x6d2b79f5) >>> 0
    let t = Math.imul(state ^ (state >>> 15), state | 1)
    t ^= t + Math.imul(t ^ (t >>> 7), t | 61)
    return ((t ^ (t >>> 14)) >>> 0) / 4294967296
  }
  return () => Math.sqrt(-2 * Math.log(1 - uniform())) * Math.cos(2 * Math.PI * uniform())
}
