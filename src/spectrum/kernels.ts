import { kernelsBase64 } from './kernels-wasm.ts'

/** What assembly/kernels.ts exports; pointers are byte offsets into `memory`. */
interface KernelExports {
  tridiagonalise(a: number, n: number, ld: number, d: number, e: number, tau: number, work: number): void
  eigenvalues(d: number, e: number, n: number): number
  backTransform(a: number, n: number, ld: number, tau: number, v: number, k: number): void
}

export interface Kernels extends KernelExports {
  readonly memory: WebAssembly.Memory
}

const pageBytes = 65_536
/** The module keeps nothing below this offset that a caller may use. */
export const firstFreeByte = 1024

/**
 * A fresh instance of the SIMD kernels with room for `bytes`, or null where the engine refuses 128-bit SIMD
 * (then the plain TypeScript solver serves). Compiling takes under a millisecond.
 */
export function loadKernels(bytes: number): Kernels | null {
  const code = Buffer.from(kernelsBase64, 'base64')
  if (!WebAssembly.validate(code)) return null
  const memory = new WebAssembly.Memory({ initial: Math.ceil((firstFreeByte + bytes) / pageBytes) })
  const instance = new WebAssembly.Instance(new WebAssembly.Module(code), { env: { memory } })
  return { ...(instance.exports as unknown as KernelExports), memory }
}
