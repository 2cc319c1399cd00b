import { mkdir, writeFile } from 'node:fs/promises'
import { dirname, join } from 'node:path'
import { freePort, type Outcome, run, scratchFolder } from '../../support/host.ts'
import { answers, Child, ready, removeFolder } from './child.ts'
import type { PrometheusPrograms } from './provided.ts'

export interface PrometheusOptions {
  readonly port?: number
  /** prometheus.yml as a whole. */
  readonly config: string
  /** Further files beside it (rules), by relative path. */
  readonly files?: Readonly<Record<string, string>>
}

export interface Sample {
  readonly metric: Readonly<Record<string, string>>
  readonly value: number
}

/** A real Prometheus of a test's own; `programs` is `inject('prometheus')`. */
export class PrometheusProcess {
  readonly url: string
  readonly #programs: PrometheusPrograms
  readonly #folder: string
  #child: Child | null = null

  private constructor(programs: PrometheusPrograms, url: string, folder: string) {
    this.#programs = programs
    this.url = url
    this.#folder = folder
  }

  static async start(programs: PrometheusPrograms, options: PrometheusOptions): Promise<PrometheusProcess> {
    const port = options.port ?? (await freePort())
    const folder = await scratchFolder('prometheus')
    for (const [name, content] of Object.entries({ ...options.files, 'prometheus.yml': options.config })) {
      await mkdir(dirname(join(folder, name)), { recursive: true })
      await writeFile(join(folder, name), content)
    }
    const started = new PrometheusProcess(programs, `http://127.0.0.1:${port}`, folder)
    try {
      await started.restart()
    } catch (error) {
      await started.dispose()
      throw error
    }
    return started
  }

  async stop(): Promise<void> {
    await this.#child?.stop()
  }

  async kill(): Promise<void> {
    await this.#child?.kill()
  }

  /** Starts it again with the same data and port; resolves when it is ready. */
  async restart(): Promise<void> {
    const args = [
      `--config.file=${join(this.#folder, 'prometheus.yml')}`,
      `--storage.tsdb.path=${join(this.#folder, 'data')}`,
      `--web.listen-address=${this.url.slice('http://'.length)}`,
    ]
    this.#child = new Child(this.#programs.prometheus, args, this.#folder)
    await ready(this.#child, 'Prometheus', () => answers(`${this.url}/-/ready`))
  }

  /** An instant query that gives a vector. */
  async query(expression: string): Promise<Sample[]> {
    const response = await fetch(`${this.url}/api/v1/query?query=${encodeURIComponent(expression)}`)
    const answer = (await response.json()) as {
      status: string
      error?: string
      data: { result: { metric: Record<string, string>; value: [number, string] }[] }
    }
    if (answer.status !== 'success') throw new Error(`Prometheus: ${answer.error}`)
    return answer.data.result.map(({ metric, value }) => ({ metric, value: Number(value[1]) }))
  }

  get output(): string {
    return this.#child?.output ?? ''
  }

  async dispose(): Promise<void> {
    await this.#child?.kill()
    await removeFolder(this.#folder)
  }
}

/** Runs promtool, for example `promtool(inject('prometheus'), ['check', 'metrics'], exposition)`. */
export const promtool = (
  programs: PrometheusPrograms,
  args: readonly string[],
  input?: string,
): Promise<Outcome> => run(programs.promtool, args, input === undefined ? {} : { input })
