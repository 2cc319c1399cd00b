import { firstFreeByte, type Kernels, loadKernels } from './kernels.ts'
import type { Spectrum, SymmetricSolver } from './spectrum.ts'
import { TridiagonalVectors } from './tridiagonal-vectors.ts'

/**
 * The symmetric eigenproblem on the WebAssembly kernels: Householder reduction, square-root-free QL for the
 * values, inverse iteration for the leading vectors. The matrix is scaled to largest entry 1 on the way.
 * Scratch memory grows with the largest order seen.
 */
export class SimdSolver implements SymmetricSolver {
  #room: Room | null = null
  #vectors = new TridiagonalVectors()

  /** Does this engine run the kernels? Where not, the plain TypeScript solver serves. */
  static readonly supported = loadKernels(0) !== null

  /** @throws RangeError when an entry of the lower triangle is not finite */
  solve(matrix: Float64Array, n: number, modes: number): Spectrum {
    if (n === 0) return emptySpectrum
    const room = this.#reserve(n)
    const { kernels, ld } = room
    const scale = room.load(matrix, n)
    kernels.tridiagonalise(room.matrix, n, ld, room.diagonal, room.coupling, room.tau, room.work)
    const diagonal = room.view(room.diagonal, n).slice()
    const coupling = room.view(room.coupling, n).slice()
    if (kernels.eigenvalues(room.diagonal, room.coupling, n) < 0) {
      throw new RangeError(`the QL iteration on a matrix of order ${n} did not converge`)
    }
    const sorted = room.view(room.diagonal, n).slice().sort().reverse()
    const k = Math.min(modes, n)
    const vectors = new Float64Array(k * n)
    if (k > 0) {
      const rows = room.view(room.vectors, k * ld)
      rows.fill(0)
      this.#vectors.compute(diagonal, coupling, n, sorted, k, rows, ld)
      kernels.backTransform(room.matrix, n, ld, room.tau, room.vectors, k)
      for (let j = 0; j < k; j++) {
        const row = rows.subarray(j * ld, j * ld + n)
        vectors.set(row, j * n)
        pointUp(vectors.subarray(j * n, (j + 1) * n))
      }
    }
    for (let i = 0; i < n; i++) sorted[i] = sorted[i]! * scale
    return { n, values: sorted, modes: k, vectors, age: 0, bound: 0 }
  }

  #reserve(n: number): Room {
    if (this.#room === null || this.#room.capacity < n) this.#room = new Room(n)
    this.#room.shape(n)
    return this.#room
  }
}

const emptySpectrum: Spectrum = {
  n: 0,
  values: new Float64Array(0),
  modes: 0,
  vectors: new Float64Array(0),
  age: 0,
  bound: 0,
}

/** Turns a vector so that its entry of largest magnitude is positive. */
function pointUp(vector: Float64Array): void {
  let largest = 0
  for (let i = 1; i < vector.length; i++) {
    if (Math.abs(vector[i]!) > Math.abs(vector[largest]!)) largest = i
  }
  if (vector[largest]! < 0) for (let i = 0; i < vector.length; i++) vector[i] = -vector[i]!
}

const doubleBytes = 8

/** Where everything lies in the kernels' memory. Offsets are bytes; the order may be any up to the capacity. */
class Room {
  readonly capacity: number
  readonly kernels: Kernels
  ld = 0
  matrix = 0
  diagonal = 0
  coupling = 0
  tau = 0
  work = 0
  vectors = 0

  constructor(n: number) {
    this.capacity = n
    const ld = padded(n)
    const kernels = loadKernels((2 * ld * ld + 8 * ld + 64) * doubleBytes)
    if (kernels === null) throw new RangeError('this engine does not run the SIMD kernels')
    this.kernels = kernels
  }

  /** Lays the memory out for order n, up to the capacity. */
  shape(n: number): void {
    const ld = padded(n)
    let next = firstFreeByte
    const take = (entries: number): number => {
      const at = next
      next += entries * doubleBytes
      return at
    }
    this.ld = ld
    this.matrix = take(ld * ld)
    this.diagonal = take(ld)
    this.coupling = take(ld)
    this.tau = take(ld)
    this.work = take(4 * ld)
    this.vectors = take(ld * ld)
  }

  view(at: number, entries: number): Float64Array {
    return new Float64Array(this.kernels.memory.buffer, at, entries)
  }

  /** Copies the lower triangle in, its diagonal blocks mirrored, divided by its largest entry; gives that. */
  load(matrix: Float64Array, n: number): number {
    const ld = this.ld
    const target = this.view(this.matrix, ld * ld)
    let largest = 0
    for (let i = 0; i < n; i++) {
      for (let j = 0; j <= i; j++) {
        const size = Math.abs(matrix[i * n + j]!)
        if (!(size <= largest)) largest = size
      }
    }
    if (!Number.isFinite(largest)) throw new RangeError('the matrix has an entry that is not finite')
    const factor = largest > 0 ? 1 / largest : 1
    target.fill(0)
    for (let i = 0; i < n; i++) {
      for (let j = 0; j <= i; j++) target[i * ld + j] = matrix[i * n + j]! * factor
      const mirror = (i & ~1) + 1
      if (mirror > i && mirror < n) target[i * ld + mirror] = matrix[mirror * n + i]! * factor
    }
    return largest > 0 ? largest : 1
  }
}

const padded = (n: number): number => (n + 3) & ~3
