import { EigenvalueDecomposition, Matrix } from 'ml-matrix'
import { describe, expect, it } from 'vitest'
import { BoxcarWindow } from '../../src/window/boxcar-window.ts'
import { truncationCertificate } from '../../src/window/certificate.ts'
import { ExponentialWindow } from '../../src/window/exponential-window.ts'
import { TwinWindow } from '../../src/window/twin-window.ts'
import { normals } from './batch.ts'

function spectrumOf(matrix: Float64Array, n: number): number[] {
  const rows = Array.from({ length: n }, (_, i) => [...matrix.subarray(i * n, (i + 1) * n)])
  const solved = new EigenvalueDecomposition(new Matrix(rows), { assumeSymmetric: true })
  return solved.realEigenvalues.sort((a, b) => b - a)
}

/** Heavy-tailed frames (t with 2.5 degrees of freedom or so, by a chi-square of few normals). */
function heavyFrames(seed: number, n: number) {
  const normal = normals(seed)
  return (at: number) => {
    const common = normal()
    const scaled = Float64Array.from({ length: n }, () => {
      const tail = Math.sqrt((normal() ** 2 + normal() ** 2 + normal() ** 2) / 3)
      return (0.6 * common + normal()) / Math.max(tail, 0.05)
    })
    const cleaned = scaled.map((v) => Math.min(at, Math.max(-at, v)))
    return { scaled, cleaned, clipped: scaled.filter((v, i) => v !== cleaned[i]).length }
  }
}

describe('the truncation certificate', () => {
  it('is tight for equal correlation moved from .2 to .5: .3·√29 (check values, N = 30)', () => {
    const n = 30
    const equal = (r: number): Float64Array =>
      Float64Array.from({ length: n * n }, (_, k) => (Math.floor(k / n) === k % n ? 1 : r))
    expect(truncationCertificate(equal(0.2), equal(0.5), n)).toBeCloseTo(1.6155494, 7)
  })

  it('bounds W2 of the two spectra in every frame of fat-tailed data', () => {
    const n = 8
    const next = heavyFrames(31, n)
    const twin = new TwinWindow(() => new BoxcarWindow(24))
    const present = new Uint8Array(n).fill(1)
    let largest = 0
    for (let t = 0; t < 400; t++) {
      const { scaled, cleaned, clipped } = next(3)
      twin.push(scaled, cleaned, present, clipped)
      if (t < 24) continue
      const active = twin.cleaned.active()
      const size = active.length
      const matrix = new Float64Array(size * size)
      const raw = new Float64Array(size * size)
      twin.cleaned.correlation(matrix, active)
      twin.scaled.correlation(raw, active)
      const certificate = twin.certificate(matrix, active)
      const after = spectrumOf(matrix, size)
      const w2 = Math.sqrt(spectrumOf(raw, size).reduce((s, v, k) => s + (v - after[k]!) ** 2, 0) / size)
      expect(w2).toBeLessThanOrEqual(certificate + 1e-9)
      largest = Math.max(largest, certificate)
    }
    expect(largest).toBeGreaterThan(0.1)
  })

  it.each([
    ['boxcar', () => new BoxcarWindow(20)],
    ['exponential', () => new ExponentialWindow(4)],
  ] as const)('is exactly 0 before a clipped %s frame comes and after it has left', (_, make) => {
    const normal = normals(32)
    const n = 3
    const twin = new TwinWindow(make)
    const scaledOnly = make()
    const present = new Uint8Array(n).fill(1)
    const active = Int32Array.of(0, 1, 2)
    const seen: boolean[] = []
    for (let t = 0; t < 600; t++) {
      const scaled = Float64Array.from({ length: n }, normal)
      if (t === 100) scaled[1] = 30
      const cleaned = scaled.map((v) => Math.min(5, v))
      twin.push(scaled, cleaned, present, t === 100 ? 1 : 0)
      scaledOnly.push(scaled, present)
      const matrix = new Float64Array(9)
      const c = new Float64Array(9)
      twin.cleaned.correlation(matrix, active)
      scaledOnly.correlation(c, active)
      const certificate = twin.certificate(matrix, active)
      expect(certificate).toBeCloseTo(truncationCertificate(c, matrix, n), 10)
      seen.push(certificate > 0)
      if (!twin.twinned) expect(certificate).toBe(0)
    }
    const memory = twin.cleaned.memory
    expect(seen.slice(0, 100).some(Boolean)).toBe(false)
    expect(seen.slice(100, 110).every(Boolean)).toBe(true)
    expect(seen.slice(100 + memory).some(Boolean)).toBe(false)
  })

  it('goes on bit for bit after a snapshot taken in either condition', () => {
    const n = 4
    const present = new Uint8Array(n).fill(1)
    for (const at of [3, 1e9]) {
      const next = heavyFrames(33, n)
      const a = new TwinWindow(() => new BoxcarWindow(15, 6))
      const b = new TwinWindow(() => new BoxcarWindow(15, 6))
      for (let t = 0; t < 40; t++) {
        const f = next(at)
        a.push(f.scaled, f.cleaned, present, f.clipped)
      }
      b.restore(structuredClone(a.snapshot()))
      for (let t = 0; t < 40; t++) {
        const f = next(3)
        for (const twin of [a, b]) twin.push(f.scaled, f.cleaned, present, f.clipped)
        const active = a.cleaned.active()
        const x = new Float64Array(active.length ** 2)
        const y = new Float64Array(active.length ** 2)
        a.cleaned.correlation(x, active)
        b.cleaned.correlation(y, active)
        expect(y).toEqual(x)
        expect(b.certificate(y, active)).toBe(a.certificate(x, active))
      }
    }
  })
})
