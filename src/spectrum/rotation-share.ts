/**
 * 1 − (w2/ceiling)², in [0, 1]: the part of the squared distance of two matrices that their spectra do not
 * explain. Near 0 the strengths changed, near 1 the partners did; 0 when the ceiling is 0.
 */
export function rotationShare(w2: number, ceiling: number): number {
  if (!(ceiling > 0)) return 0
  const explained = w2 / ceiling
  return Math.min(1, Math.max(0, 1 - explained * explained))
}
