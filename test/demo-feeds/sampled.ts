import type { DemoChunk } from '../../demo-feeds/demo-feed.ts'

/** Last value by event time at the end of every frame, frames × signals; NaN before a signal's first reading. */
export function sampled(chunks: Iterable<DemoChunk>, start: number, stepMs: number): Float64Array[] {
  const rows: Float64Array[] = []
  const latest: number[] = []
  for (const { count, names, signal, time, value } of chunks)
    for (let i = 0; i < count; i++) {
      const frame = Math.floor((time[i]! - start) / stepMs)
      while (rows.length <= frame) rows.push(new Float64Array(names.length).fill(Number.NaN))
      const at = frame * names.length + signal[i]!
      if ((latest[at] ?? Number.NEGATIVE_INFINITY) > time[i]!) continue
      latest[at] = time[i]!
      rows[frame]![signal[i]!] = value[i]!
    }
  for (let f = 1; f < rows.length; f++)
    rows[f]!.forEach((value, j) => {
      if (Number.isNaN(value)) rows[f]![j] = rows[f - 1]![j]!
    })
  return rows
}

/** Differences of the logarithms of neighbouring rows. */
export const logReturns = (rows: readonly Float64Array[]): Float64Array[] =>
  rows.slice(1).map((row, f) => row.map((value, j) => Math.log(value / rows[f]![j]!)))

/** Every frame divided by its root mean square over signals, each signal in its own scale: Tyler's spatial sign. */
export function spatialSigns(rows: readonly Float64Array[]): Float64Array[] {
  const n = rows[0]!.length
  const scale = Float64Array.from({ length: n }, (_, j) => {
    const sizes = rows.map((row) => Math.abs(row[j]!)).sort((a, b) => a - b)
    return sizes[sizes.length >> 1]!
  })
  return rows.map((row) => {
    const scaled = row.map((value, j) => value / scale[j]!)
    const size = Math.sqrt(scaled.reduce((sum, value) => sum + value ** 2, 0) / n)
    return scaled.map((value) => value / size)
  })
}

/** Pearson correlation matrix of the columns, n rows of n. */
export function correlation(rows: readonly Float64Array[]): Float64Array[] {
  const n = rows[0]!.length
  const columns = Array.from({ length: n }, (_, j) => {
    const column = Float64Array.from(rows, (row) => row[j]!)
    const mean = column.reduce((sum, value) => sum + value, 0) / column.length
    const centred = column.map((value) => value - mean)
    const size = Math.sqrt(centred.reduce((sum, value) => sum + value ** 2, 0))
    return centred.map((value) => value / size)
  })
  const product = (a: Float64Array, b: Float64Array) => a.reduce((sum, value, t) => sum + value * b[t]!, 0)
  return columns.map((a) => Float64Array.from(columns, (b) => product(a, b)))
}

/** Mean of the entries (i, j), i ≠ j, that `wanted` picks. */
export function meanEntry(
  matrix: readonly Float64Array[],
  wanted: (i: number, j: number) => boolean = () => true,
): number {
  let sum = 0
  let count = 0
  matrix.forEach((row, i) => {
    row.forEach((value, j) => {
      if (i === j || !wanted(i, j)) return
      sum += value
      count++
    })
  })
  return sum / count
}

/** Correlation of a column with itself one row later. */
export function lagOne(rows: readonly Float64Array[], column: number): number {
  const pairs = rows.slice(1).map((row, t) => Float64Array.of(rows[t]![column]!, row[column]!))
  return correlation(pairs)[0]![1]!
}
