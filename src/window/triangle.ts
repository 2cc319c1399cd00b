/**
 * Symmetric matrices as packed lower triangles: entry (i, j), j ≤ i, lies at i(i+1)/2 + j. A row more is
 * appended behind the others, so a matrix grows without moving an entry.
 */
export const triangleSize = (n: number): number => (n * (n + 1)) / 2

/** S ← S + w·y yᵀ on the first n rows. */
export function addOuter(s: Float64Array, y: Float64Array, n: number, w: number): void {
  for (let i = 0, k = 0; i < n; i++) {
    const f = w * y[i]!
    if (f === 0) {
      k += i + 1
      continue
    }
    for (let j = 0; j <= i; j++, k++) s[k]! += f * y[j]!
  }
}

/**
 * S ← S + Σ y yᵀ over four vectors in one pass: entry i of vector v lies at `rows[at[v] + i]`. Four at a time
 * the matrix is read and written once instead of four times.
 */
export function addFourOuter(s: Float64Array, rows: Float64Array, at: readonly number[], n: number): void {
  const [a = 0, b = 0, c = 0, d = 0] = at
  for (let i = 0, k = 0; i < n; i++) {
    const ya = rows[a + i]!
    const yb = rows[b + i]!
    const yc = rows[c + i]!
    const yd = rows[d + i]!
    for (let j = 0; j <= i; j++, k++) {
      s[k] = s[k]! + (ya * rows[a + j]! + yb * rows[b + j]!) + (yc * rows[c + j]! + yd * rows[d + j]!)
    }
  }
}

/** S ← S + y yᵀ − z zᵀ in one pass: one frame in, one out. */
export function exchangeOuter(s: Float64Array, y: Float64Array, z: Float64Array, n: number): void {
  for (let i = 0, k = 0; i < n; i++) {
    const f = y[i]!
    const g = z[i]!
    if (f === 0 && g === 0) {
      k += i + 1
      continue
    }
    for (let j = 0; j <= i; j++, k++) s[k] = s[k]! + f * y[j]! - g * z[j]!
  }
}

/** S ← a·S + w·y yᵀ in one pass: one step of an exponential memory. */
export function decayOuter(s: Float64Array, y: Float64Array, n: number, a: number, w: number): void {
  for (let i = 0, k = 0; i < n; i++) {
    const f = w * y[i]!
    for (let j = 0; j <= i; j++, k++) s[k] = a * s[k]! + f * y[j]!
  }
}

/** S ← (S − w·y yᵀ)/a: takes the last step of `decayOuter` back. */
export function undecayOuter(s: Float64Array, y: Float64Array, n: number, a: number, w: number): void {
  for (let i = 0, k = 0; i < n; i++) {
    const f = w * y[i]!
    for (let j = 0; j <= i; j++, k++) s[k] = (s[k]! - f * y[j]!) / a
  }
}
