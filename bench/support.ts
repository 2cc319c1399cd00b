import { type SpawnSyncReturns, spawnSync } from 'node:child_process'
import { existsSync, mkdirSync } from 'node:fs'
import { cpus, homedir, totalmem } from 'node:os'
import { join } from 'node:path'

const cacheHome = process.env.XDG_CACHE_HOME ?? join(homedir(), '.cache')
/** Where the Python environment and the generated feeds are kept between runs, outside the repository. */
export const cache = join(cacheHome, 'tautline-bench')

/** Runs a command to its end; throws with its stderr when it fails. */
export function run(command: string, args: readonly string[], env: NodeJS.ProcessEnv = process.env): string {
  const done: SpawnSyncReturns<string> = spawnSync(command, args, {
    env,
    encoding: 'utf8',
    maxBuffer: 1 << 28,
    stdio: ['ignore', 'ignore', 'pipe'],
  })
  if (done.error) throw done.error
  if (done.status !== 0)
    throw new Error(`${command} ${args.join(' ')} ended with ${done.status}\n${done.stderr}`)
  return done.stderr
}

/** The Python of an environment with the baseline's libraries, made on first use. */
export function baselinePython(): string {
  mkdirSync(cache, { recursive: true })
  const python = join(cache, 'venv', 'bin', 'python')
  if (!existsSync(python)) run('python3', ['-m', 'venv', join(cache, 'venv')])
  const probe = spawnSync(python, [
    '-c',
    'import numpy, scipy, polars, orjson, confluent_kafka, threadpoolctl',
  ])
  if (probe.status !== 0) {
    const wanted = ['numpy>=2.4', 'scipy', 'polars', 'orjson', 'confluent-kafka', 'threadpoolctl']
    run(python, ['-m', 'pip', 'install', '-q', ...wanted])
  }
  return python
}

/** One BLAS thread, and the kernel that the library itself picks for this processor. */
export function baselineEnvironment(threads = 1): NodeJS.ProcessEnv {
  const { OPENBLAS_CORETYPE: _core, OPENBLAS_L2_SIZE: _l2, ...rest } = process.env
  return { ...rest, OPENBLAS_NUM_THREADS: String(threads) }
}

export function describeMachine(python: string): string {
  const program =
    'import numpy, scipy, sys; from threadpoolctl import threadpool_info; ' +
    'print(f"Python {sys.version.split()[0]}, numpy {numpy.__version__}, scipy {scipy.__version__}; " + ' +
    "\"; \".join(f\"{p['internal_api']} {p['version']} {p.get('architecture')} x{p['num_threads']}\" for p in threadpool_info()))"
  const shown = spawnSync(python, ['-c', `import scipy.linalg; ${program}`], {
    env: baselineEnvironment(),
    encoding: 'utf8',
  })
  const cpu = cpus()
  return `Node ${process.version} on ${cpu.length} × ${cpu[0]?.model ?? 'unknown processor'}, ${(totalmem() / 2 ** 30).toFixed(0)} GiB; ${shown.stdout.trim()}`
}

export const median = (values: readonly number[]): number => {
  const sorted = [...values].sort((a, b) => a - b)
  const middle = sorted.length >> 1
  return sorted.length % 2 === 1 ? sorted[middle]! : (sorted[middle - 1]! + sorted[middle]!) / 2
}

/** `1.84 [1.61..2.20]`: the median and the range. */
export const spread = (values: readonly number[]): string =>
  `${median(values).toFixed(2)} [${Math.min(...values).toFixed(2)}..${Math.max(...values).toFixed(2)}]`
