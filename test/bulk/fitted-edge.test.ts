import { describe, expect, it } from 'vitest'
import { FittedEdge } from '../../src/bulk/fitted-edge.ts'
import type { FrameTable } from '../../src/bulk/resampled-edge.ts'
import { fastestSolver } from '../../src/spectrum/fastest-solver.ts'
import { Random } from '../support/random.ts'
import { spectrumOf } from './noise.ts'

const solver = fastestSolver()
const [n, frames] = [40, 160]

/** A stream of frames: one common mode, noise with memory r; gives one window after another. */
function* windows(seed: number, r: number, count: number) {
  const random = new Random(seed)
  const states = new Float64Array(n)
  const kept: Float64Array[] = []
  for (let t = 0; t < frames + count; t++) {
    const common = random.normal()
    kept.push(
      Float64Array.from({ length: n }, (_, i) => {
        states[i] = r * states[i]! + Math.sqrt(1 - r * r) * random.normal()
        return states[i]! + 0.9 * common
      }),
    )
    if (kept.length > frames) kept.shift()
    if (kept.length < frames) continue
    const values = new Float64Array(n * frames)
    kept.forEach((frame, row) => {
      for (let i = 0; i < n; i++) values[i * frames + row] = frame[i]!
    })
    const table = (): FrameTable => ({
      n,
      frames,
      values: Float64Array.from(kept.flatMap((frame) => [...frame])),
    })
    yield { spectrum: spectrumOf({ n, frames, values }, { modes: 3 }), table }
  }
}

const edge = (seed = 1) => new FittedEdge({ level: 0.01, decay: null, scale: 'correlation' }, solver, seed)

describe('the edge of one window after another', () => {
  it('is that of the law while the law describes the bulk', () => {
    const fitted = edge()
    for (const { spectrum, table } of windows(1, 0, 40)) {
      const bulk = fitted.fit(spectrum, frames, table)
      expect(bulk.model).toBe('marchenko-pastur')
      expect(bulk.escapes.length).toBeLessThanOrEqual(2)
    }
  })

  it('becomes the resampled one when memory widens the bulk, and then finds the one common mode', () => {
    const fitted = edge()
    const bulks = [...windows(2, 0.7, 160)].map(({ spectrum, table }) => fitted.fit(spectrum, frames, table))
    expect(bulks[0]!.model).toBe('marchenko-pastur')
    expect(bulks[0]!.escapes.length).toBeGreaterThan(4)
    const last = bulks.slice(-60)
    expect(new Set(last.map(({ model }) => model))).toEqual(new Set(['resampled']))
    const wrong = last.filter(({ escapes }) => escapes.length !== 1).length
    expect(wrong / last.length).toBeLessThan(0.1)
  })

  it('goes on bit for bit from a snapshot', () => {
    const all = [...windows(3, 0.7, 90)]
    const whole = edge(5)
    const first = edge(5)
    const resumed = edge(9)
    all.forEach(({ spectrum, table }, k) => {
      const expected = whole.fit(spectrum, frames, table)
      if (k === 50) resumed.restore(structuredClone(first.snapshot()))
      if (k < 50) first.fit(spectrum, frames, table)
      else expect(resumed.fit(spectrum, frames, table)).toEqual(expected)
    })
  })
})
