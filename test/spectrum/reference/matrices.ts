/** mulberry32 (Tommy Ettinger, public domain), as in eigenvalues.py. */
class Mulberry {
  #state: number

  constructor(seed: number) {
    this.#state = seed >>> 0
  }

  uniform(): number {
    this.#state = (this.#state + 0x6d2b79f5) >>> 0
    let t = this.#state
    t = Math.imul(t ^ (t >>> 15), t | 1)
    t ^= t + Math.imul(t ^ (t >>> 7), t | 61)
    return ((t ^ (t >>> 14)) >>> 0) / 4294967296
  }

  centred(): number {
    return 2 * this.uniform() - 1
  }
}

export interface Square {
  readonly n: number
  /** n × n, row-major. */
  readonly entries: Float64Array
}

const square = (n: number, entry: (i: number, j: number) => number): Square => ({
  n,
  entries: Float64Array.from({ length: n * n }, (_, k) => entry(Math.floor(k / n), k % n)),
})

function symmetric(draw: Mulberry, n: number): Square {
  const entries = new Float64Array(n * n)
  for (let i = 0; i < n; i++) {
    for (let j = 0; j <= i; j++) {
      const x = draw.centred()
      entries[i * n + j] = x
      entries[j * n + i] = x
    }
  }
  return { n, entries }
}

function correlation(draw: Mulberry, n: number, frames: number): Square {
  const x = Array.from({ length: n }, () => new Float64Array(frames))
  for (let t = 0; t < frames; t++) {
    const common = draw.centred()
    for (let i = 0; i < n; i++) x[i]![t] = 0.5 * common + draw.centred()
  }
  const inner = (a: Float64Array, b: Float64Array) => a.reduce((sum, v, t) => sum + v * b[t]!, 0)
  const norms = x.map((row) => Math.sqrt(inner(row, row)))
  return square(n, (i, j) => inner(x[i]!, x[j]!) / (norms[i]! * norms[j]!))
}

function graded(draw: Mulberry, n: number, decades: number, upwards: boolean): Square {
  const { entries } = symmetric(draw, n)
  const scale = (i: number) => 10 ** ((-decades * (upwards ? n - 1 - i : i)) / n)
  return square(n, (i, j) => (entries[i * n + j]! + (i === j ? 2 : 0)) * scale(i) * scale(j))
}

function repeated(draw: Mulberry, n: number, values: readonly number[]): Square {
  const times = n / values.length
  let { entries } = square(n, (i, j) => (i === j ? values[Math.floor(i / times)]! : 0))
  for (let turn = 0; turn < 2; turn++) {
    const u = Float64Array.from({ length: n }, () => draw.centred())
    const norm2 = u.reduce((sum, v) => sum + v * v, 0)
    const h = square(n, (i, j) => (i === j ? 1 : 0) - (2 * u[i]! * u[j]!) / norm2).entries
    entries = product(product(h, entries, n), h, n)
  }
  return square(n, (i, j) => (entries[i * n + j]! + entries[j * n + i]!) / 2)
}

function product(a: Float64Array, b: Float64Array, n: number): Float64Array {
  return square(n, (i, j) => {
    let sum = 0
    for (let k = 0; k < n; k++) sum += a[i * n + k]! * b[k * n + j]!
    return sum
  }).entries
}

const scaled = ({ n, entries }: Square, factor: number): Square => ({
  n,
  entries: entries.map((x) => x * factor),
})

const wilkinson = (n: number): Square =>
  square(n, (i, j) => (i === j ? Math.abs(i - (n - 1) / 2) : Math.abs(i - j) === 1 ? 1 : 0))

/** The matrices of eigenvalues.py, by name. */
export const matrices: Readonly<Record<string, () => Square>> = {
  'random 2': () => symmetric(new Mulberry(2), 2),
  'random 7': () => symmetric(new Mulberry(7), 7),
  'random 60': () => symmetric(new Mulberry(60), 60),
  'random 101': () => symmetric(new Mulberry(101), 101),
  'correlation 30 x 100': () => correlation(new Mulberry(30), 30, 100),
  'correlation 100 x 200': () => correlation(new Mulberry(100), 100, 200),
  'graded downwards 40': () => graded(new Mulberry(40), 40, 6, false),
  'graded upwards 41': () => graded(new Mulberry(41), 41, 6, true),
  'repeated 24': () => repeated(new Mulberry(24), 24, [5, 2, 2, 0.5]),
  'repeated 60': () => repeated(new Mulberry(61), 60, [1, 1, 1, 1 - 1e-9]),
  'near-singular: 50 signals, 20 frames': () => correlation(new Mulberry(50), 50, 20),
  'near-singular: Hilbert 12': () => square(12, (i, j) => 1 / (i + j + 1)),
  'Wilkinson 21': () => wilkinson(21),
  'tiny 20': () => scaled(symmetric(new Mulberry(20), 20), 2 ** -900),
  'huge 20': () => scaled(symmetric(new Mulberry(20), 20), 2 ** 900),
}
