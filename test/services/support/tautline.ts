import { type ChildProcess, spawn } from 'node:child_process'
import { once } from 'node:events'
import { fileURLToPath } from 'node:url'
import type { TautlineRecord } from '../../../src/observe/records.ts'
import { until } from '../../support/host.ts'

const program = fileURLToPath(new URL('../../../dist/src/cli.js', import.meta.url))

/** The built program as a process of its own, its records and its log gathered. */
export class Tautline {
  readonly #child: ChildProcess
  #stdout = ''
  stderr = ''
  /** Exit status, once it has ended. */
  status: number | null = null

  constructor(args: readonly string[], env: NodeJS.ProcessEnv = {}) {
    this.#child = spawn(process.execPath, [program, ...args], {
      env: { ...process.env, ...env },
      stdio: ['ignore', 'pipe', 'pipe'],
    })
    this.#child.stdout!.setEncoding('utf8').on('data', (text: string) => {
      this.#stdout += text
    })
    this.#child.stderr!.setEncoding('utf8').on('data', (text: string) => {
      this.stderr += text
    })
    this.#child.on('exit', (status) => {
      this.status = status
    })
  }

  get stdout(): string {
    return this.#stdout
  }

  /** Complete lines of stdout. */
  get lines(): string[] {
    return this.#stdout.split('\n').slice(0, -1)
  }

  get records(): TautlineRecord[] {
    return this.lines.map((line) => JSON.parse(line) as TautlineRecord)
  }

  kill(signal: NodeJS.Signals): void {
    this.#child.kill(signal)
  }

  /** Resolves to the exit status. */
  async ended(): Promise<number | null> {
    if (this.status === null) await once(this.#child, 'close')
    return this.status
  }

  /** Asks it to stop and waits until it has. */
  async stop(): Promise<number | null> {
    this.kill('SIGTERM')
    return this.ended()
  }

  /** Waits until the page answers; gives its address. */
  async page(): Promise<string> {
    let url = ''
    await until('the page', async () => {
      if (this.status !== null) throw new Error(`tautline ended with ${this.status}\n${this.stderr}`)
      url = /"url":"(http:[^"]+)"/.exec(this.stderr)?.[1] ?? ''
      return url !== ''
    })
    return url
  }
}
