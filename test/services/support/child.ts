import { type ChildProcess, spawn } from 'node:child_process'
import { rm } from 'node:fs/promises'
import { setTimeout as sleep } from 'node:timers/promises'

const tailBytes = 16_384

/**
 * A service that runs as a child process. Beside it a small shell waits for the end of this process, however
 * that comes (even SIGKILL): it then ends the service by its pid and removes its scratch folder.
 * Works on systems with a POSIX shell.
 */
export class Child {
  readonly pid: number
  readonly exited: Promise<number | null>
  #process: ChildProcess
  #guard: ChildProcess
  #tail = ''

  constructor(program: string, args: readonly string[], scratch: string, env: Record<string, string> = {}) {
    this.#process = spawn(program, args, {
      cwd: scratch,
      detached: true,
      stdio: ['ignore', 'pipe', 'pipe'],
      env: { ...process.env, ...env },
    })
    if (this.#process.pid === undefined) throw new Error(`${program} could not be started`)
    this.pid = this.#process.pid
    for (const stream of [this.#process.stdout!, this.#process.stderr!])
      stream.on('data', (chunk: Buffer) => {
        this.#tail = (this.#tail + chunk.toString()).slice(-tailBytes)
      })
    const guardScript =
      'while read -r line; do :; done; kill -9 "$1" 2>/dev/null; sleep 0.2; rm -rf -- "$2"; sleep 1; rm -rf -- "$2"'
    this.#guard = spawn('sh', ['-c', guardScript, 'guard', String(this.pid), scratch], {
      detached: true,
      stdio: ['pipe', 'ignore', 'ignore'],
    })
    this.#guard.stdin!.on('error', () => {})
    // Neither may keep this process alive, until it waits for their end.
    this.#process.unref()
    this.#guard.unref()
    this.exited = new Promise((resolve) => {
      this.#process.once('exit', (code) => {
        this.#guard.kill('SIGKILL')
        resolve(code)
      })
    })
  }

  get running(): boolean {
    return this.#process.exitCode === null && this.#process.signalCode === null
  }

  /** The last of what it wrote on its two outputs. */
  get output(): string {
    return this.#tail
  }

  /** SIGTERM, and SIGKILL when it has not ended after `graceMs`. */
  async stop(graceMs = 20_000): Promise<void> {
    if (!this.running) return
    this.#process.ref()
    this.#process.kill('SIGTERM')
    const patience = new AbortController()
    const slow = sleep(graceMs, 'slow', { signal: patience.signal }).catch(() => null)
    if ((await Promise.race([this.exited, slow])) === 'slow') this.#process.kill('SIGKILL')
    await this.exited
    patience.abort()
  }

  /** SIGKILL: as a crash. */
  async kill(): Promise<void> {
    this.#process.ref()
    if (this.running) this.#process.kill('SIGKILL')
    await this.exited
  }
}

/** Asks a child until it is ready; a child that ends meanwhile is an error that shows its last words. */
export async function ready(
  child: Child,
  what: string,
  ask: () => Promise<boolean>,
  withinMs = 60_000,
): Promise<void> {
  const end = performance.now() + withinMs
  while (performance.now() < end) {
    if (!child.running) throw new Error(`${what} ended while starting: ${child.output.slice(-2000)}`)
    if (await ask().catch(() => false)) return
    await sleep(40)
  }
  throw new Error(`${what} was not ready within ${withinMs} ms: ${child.output.slice(-2000)}`)
}

/** True when an HTTP GET answers 2xx. */
export const answers = async (url: string): Promise<boolean> =>
  (await fetch(url, { signal: AbortSignal.timeout(2000) })).ok

export const removeFolder = (folder: string): Promise<void> =>
  rm(folder, { recursive: true, force: true, maxRetries: 5, retryDelay: 100 })
