import { type SpawnOptions, spawn } from 'node:child_process'
import { randomInt } from 'node:crypto'
import { accessSync, constants } from 'node:fs'
import { mkdir, mkdtemp, readFile, rm, writeFile } from 'node:fs/promises'
import { createServer } from 'node:net'
import { homedir, tmpdir } from 'node:os'
import { delimiter, join } from 'node:path'
import { setTimeout as sleep } from 'node:timers/promises'

/** Folder for what tests fetch once and keep: outside the repository, after the XDG base directory specification. */
export const cacheFolder = join(process.env.XDG_CACHE_HOME || join(homedir(), '.cache'), 'tautline-tests')

export const scratchFolder = (purpose: string): Promise<string> =>
  mkdtemp(join(tmpdir(), `tautline-${purpose}-`))

export function isProgram(path: string): boolean {
  try {
    accessSync(path, constants.X_OK)
    return true
  } catch {
    return false
  }
}

/** Full path of the first of `names` that is on the PATH and may be run, or null. */
export function findProgram(...names: string[]): string | null {
  for (const name of names)
    for (const folder of (process.env.PATH ?? '').split(delimiter)) {
      const path = join(folder, name)
      if (isProgram(path)) return path
    }
  return null
}

export interface Outcome {
  /** Exit status; null when ended by a signal or never started. */
  readonly code: number | null
  readonly stdout: string
  readonly stderr: string
}

/** Runs a program to its end. A program that cannot be started gives code null and the cause in `stderr`. */
export function run(
  program: string,
  args: readonly string[],
  options: SpawnOptions & { input?: string; timeoutMs?: number } = {},
): Promise<Outcome> {
  const { input, timeoutMs = 600_000, ...spawnOptions } = options
  return new Promise((resolve) => {
    const child = spawn(program, args, { ...spawnOptions, stdio: 'pipe', timeout: timeoutMs })
    const out: Buffer[] = []
    const err: Buffer[] = []
    child.stdout!.on('data', (chunk: Buffer) => out.push(chunk))
    child.stderr!.on('data', (chunk: Buffer) => err.push(chunk))
    const text = (chunks: Buffer[]) => Buffer.concat(chunks).toString()
    child.on('error', (error) => resolve({ code: null, stdout: text(out), stderr: String(error) }))
    child.on('close', (code) => resolve({ code, stdout: text(out), stderr: text(err) }))
    child.stdin!.on('error', () => {})
    child.stdin!.end(input ?? '')
  })
}

/** As `run`, but a status other than 0 is an error that shows the end of what the program said. */
export async function runOrThrow(...call: Parameters<typeof run>): Promise<string> {
  const { code, stdout, stderr } = await run(...call)
  if (code !== 0)
    throw new Error(
      `${call[0]} ${call[1].slice(0, 3).join(' ')} … ended with ${code}: ${(stderr || stdout).slice(-1500)}`,
    )
  return stdout
}

const givenPorts = new Set<number>()

/**
 * A free port of 127.0.0.1 below the range from which systems take ports for outgoing connections, so that
 * a server stopped for a while finds its port free again.
 */
export async function freePort(): Promise<number> {
  for (let attempt = 0; attempt < 200; attempt++) {
    const port = randomInt(15_000, 32_000)
    if (givenPorts.has(port)) continue
    const free = await new Promise<boolean>((resolve) => {
      const server = createServer()
      server.once('error', () => resolve(false))
      server.listen(port, '127.0.0.1', () => server.close(() => resolve(true)))
    })
    if (!free) continue
    givenPorts.add(port)
    return port
  }
  throw new Error('no free port found on 127.0.0.1 between 15000 and 32000')
}

const isAlive = (pid: number): boolean => {
  try {
    process.kill(pid, 0)
    return true
  } catch (error) {
    return (error as NodeJS.ErrnoException).code === 'EPERM'
  }
}

/**
 * Runs `work` while no other process of this machine runs work under the same name. A lock whose owner is
 * dead is taken over; `work` must therefore put its result in place by one rename.
 */
export async function alone<T>(name: string, work: () => Promise<T>): Promise<T> {
  await mkdir(cacheFolder, { recursive: true })
  const lock = join(cacheFolder, `${name}.lock`)
  for (;;) {
    try {
      await writeFile(lock, String(process.pid), { flag: 'wx' })
      break
    } catch (error) {
      if ((error as NodeJS.ErrnoException).code !== 'EEXIST') throw error
      const owner = Number(await readFile(lock, 'utf8').catch(() => 'NaN'))
      if (owner > 0 && !isAlive(owner)) await rm(lock, { force: true })
      await sleep(150)
    }
  }
  try {
    return await work()
  } finally {
    await rm(lock, { force: true })
  }
}

/** Asks until `ask` gives something other than null or false; its errors count as "not yet". */
export async function until<T>(
  what: string,
  ask: () => Promise<T | null | false>,
  { withinMs = 30_000, everyMs = 50 } = {},
): Promise<T> {
  const end = performance.now() + withinMs
  let last: unknown = 'no answer'
  while (performance.now() < end) {
    try {
      const answer = await ask()
      if (answer !== null && answer !== false) return answer
      last = 'not yet'
    } catch (error) {
      last = error
    }
    await sleep(everyMs)
  }
  throw new Error(`${what}: not within ${withinMs} ms (${last})`)
}
