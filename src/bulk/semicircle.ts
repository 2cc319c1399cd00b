/**
 * Semicircle law on [−2, 2]: the eigenvalues of √(T/2N)·(C_a − C_b) of two disjoint windows as N/T → 0, and of
 * Wigner matrices (Wigner 1955/58; Bai & Yin 1988).
 */
export function semicircleDensity(x: number): number {
  return Math.abs(x) < 2 ? Math.sqrt(4 - x * x) / (2 * Math.PI) : 0
}

export function semicircleCdf(x: number): number {
  if (x <= -2) return 0
  if (x >= 2) return 1
  return 0.5 + (x * Math.sqrt(4 - x * x)) / (4 * Math.PI) + Math.asin(x / 2) / Math.PI
}

/** E xᵏ: Catalan's number C(k/2) for even k (Wigner 1955), 0 for odd. */
export function semicircleMoment(k: number): number {
  if (k % 2 === 1) return 0
  let catalan = 1
  for (let m = 0; m < k / 2; m++) catalan = (catalan * 2 * (2 * m + 1)) / (m + 2)
  return catalan
}
