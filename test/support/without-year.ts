/**
 * Daily values of n signals, row-major, as Haslett & Raftery 1989 take them for wind: square roots, less their
 * mean and two annual harmonics by least squares, signal by signal.
 */
export function withoutYear(values: Float64Array, n: number): Float64Array {
  const out = Float64Array.from(values, Math.sqrt)
  const days = values.length / n
  const waves = [0, 1, 2].flatMap((k) => {
    const turn = (t: number): number => (2 * Math.PI * k * t) / 365.25
    return [(t: number) => Math.cos(turn(t)), ...(k === 0 ? [] : [(t: number) => Math.sin(turn(t))])]
  })
  for (let i = 0; i < n; i++) {
    for (const wave of waves) {
      let inner = 0
      let norm = 0
      for (let t = 0; t < days; t++) {
        inner += out[t * n + i]! * wave(t)
        norm += wave(t) ** 2
      }
      for (let t = 0; t < days; t++) out[t * n + i] = out[t * n + i]! - (inner / norm) * wave(t)
    }
  }
  return out
}
