import { DistanceWatch } from '../../src/regime/distance-watch.ts'
import { Random } from '../../src/regime/random.ts'
import type { WatchOptions } from '../../src/regime/watch-options.ts'
import { SimdSolver } from '../../src/spectrum/simd-solver.ts'
import { BoxcarWindow } from '../../src/window/boxcar-window.ts'
import { LaggedWindow } from '../../src/window/lagged-window.ts'
import type { Window } from '../../src/window/window.ts'
import { Bench, frameOf, type Model, type Tail } from './simulate.ts'

export const solver = new SimdSolver()

export interface Scene {
  readonly bench: Bench
  readonly random: Random
  /** Plays frames of a model, each one changed by `touch`. */
  play(model: Model, frames: number, touch?: (x: Float64Array, frame: number) => void): void
  /** Where it stands, for `back`: several continuations then share one beginning. */
  mark(): unknown
  back(mark: unknown): void
}

/** A window, a watch and a source of frames; the watch pages once in 12,000 frames unless told otherwise. */
export function scene(
  options: Partial<WatchOptions> & { span?: number; tail?: Tail; keep?: boolean; window?: Window } = {},
  seed = 1,
): Scene {
  const span = options.span ?? 100
  const window = options.window ?? new BoxcarWindow(span)
  const reference = options.reference ?? { frames: 3 * span }
  const watch = new DistanceWatch(
    {
      limits: { framesPerFalsePage: 12_000 },
      seed,
      ...options,
      reference,
      window: { span: window.span, decay: window.decay },
    },
    solver,
  )
  const lagged =
    'lagged' in reference ? new LaggedWindow(new BoxcarWindow(span), reference.lagged) : undefined
  const bench = new Bench(window, watch, solver, {
    ...(lagged === undefined ? {} : { lagged }),
    keep: options.keep ?? false,
    covariance: options.scale === 'covariance',
  })
  const random = new Random(seed)
  let frame = 0
  return {
    bench,
    random,
    mark: () => ({ frame, random: random.state.slice(), bench: bench.suspend() }),
    back(mark) {
      const m = mark as { frame: number; random: Uint32Array; bench: unknown }
      frame = m.frame
      random.state.set(m.random)
      bench.resume(m.bench)
      for (const list of Object.values(bench.run)) list.length = 0
    },
    play(model, frames, touch) {
      for (let t = 0; t < frames; t++, frame++) {
        const x = frameOf(model, random, options.tail ?? 'normal')
        touch?.(x, frame)
        bench.push(x)
      }
    },
  }
}

export const median = (values: readonly number[]): number =>
  [...values].sort((a, b) => a - b)[Math.floor(values.length / 2)]!
