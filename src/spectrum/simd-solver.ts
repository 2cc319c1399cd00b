import { firstFreeByte, type Kernels, loadKernels } from './kernels.ts'
import { type TridiagonalCore, TridiagonalSolver } from './tridiagonal-solver.ts'

/** The symmetric eigenproblem on the WebAssembly kernels. */
export class SimdSolver extends TridiagonalSolver {
  /** Does this engine run the kernels? Where not, PlainSolver serves. */
  static readonly supported = loadKernels(0) !== null

  constructor() {
    super(new SimdCore())
  }
}

class SimdCore implements TridiagonalCore {
  #room: Room | null = null

  reduce(
    matrix: Float64Array,
    n: number,
    scale: number,
    diagonal: Float64Array,
    coupling: Float64Array,
  ): void {
    if (this.#room === null || this.#room.capacity < n) this.#room = new Room(n)
    const room = this.#room
    room.shape(n)
    room.load(matrix, n, scale)
    room.kernels.tridiagonalise(room.matrix, n, room.ld, room.diagonal, room.coupling, room.tau, room.work)
    diagonal.set(room.view(room.diagonal, n))
    coupling.set(room.view(room.coupling, n))
  }

  values(out: Float64Array, n: number): boolean {
    const room = this.#room!
    const sweeps = room.kernels.eigenvalues(room.diagonal, room.coupling, n)
    out.set(room.view(room.diagonal, n))
    return sweeps >= 0
  }

  rows(count: number): { entries: Float64Array; stride: number } {
    const room = this.#room!
    const entries = room.view(room.vectors, count * room.ld)
    entries.fill(0)
    return { entries, stride: room.ld }
  }

  backTransform(count: number): void {
    const room = this.#room!
    room.kernels.backTransform(room.matrix, room.order, room.ld, room.tau, room.vectors, count)
  }
}

const doubleBytes = 8

/** Where everything lies in the kernels' memory. Offsets are bytes; the order may be any up to the capacity. */
class Room {
  readonly capacity: number
  readonly kernels: Kernels
  order = 0
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
    if (kernels === null) throw new Error('this engine does not run the SIMD kernels')
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
    this.order = n
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

  /** Copies the lower triangle in, its diagonal blocks mirrored, divided by `scale`. */
  load(matrix: Float64Array, n: number, scale: number): void {
    const ld = this.ld
    const target = this.view(this.matrix, ld * ld)
    target.fill(0)
    for (let i = 0; i < n; i++) {
      if (scale === 1) for (let j = 0; j <= i; j++) target[i * ld + j] = matrix[i * n + j]!
      else for (let j = 0; j <= i; j++) target[i * ld + j] = matrix[i * n + j]! / scale
      const mirror = (i & ~1) + 1
      if (mirror > i && mirror < n) target[i * ld + mirror] = matrix[mirror * n + i]! / scale
    }
  }
}

const padded = (n: number): number => (n + 3) & ~3
