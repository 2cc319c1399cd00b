/**
 * W2 between two empirical spectral distributions, in units of an eigenvalue. Both spectra are sorted,
 * largest first. Equally long: √(Σ(aᵢ − bᵢ)²/N), since on the line the sorted coupling is
 * the best one; else the same coupling of quantiles, √∫(F⁻¹ − G⁻¹)² (Villani 2003, Topics in Optimal
 * Transportation, theorem 2.18). Two empty spectra are 0 apart.
 *
 * @throws RangeError when only one spectrum is empty
 */
export function wasserstein2(a: Float64Array, b: Float64Array): number {
  const n = a.length
  const m = b.length
  if (n === 0 && m === 0) return 0
  if (n === 0 || m === 0) throw new RangeError('an empty spectrum has no distance from one that is not')
  let sum = 0
  if (n === m) {
    for (let i = 0; i < n; i++) {
      const gap = a[i]! - b[i]!
      sum += gap * gap
    }
    return Math.sqrt(sum / n)
  }
  // One unit of mass is n·m parts: each entry of a holds m of them, each of b holds n.
  let done = 0
  let i = 0
  let j = 0
  while (i < n && j < m) {
    const next = Math.min((i + 1) * m, (j + 1) * n)
    const gap = a[i]! - b[j]!
    sum += gap * gap * (next - done)
    done = next
    if ((i + 1) * m === next) i++
    if ((j + 1) * n === next) j++
  }
  return Math.sqrt(sum / (n * m))
}
