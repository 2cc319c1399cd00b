import { writeFile } from 'node:fs/promises'
import { join } from 'node:path'
import { freePort, scratchFolder } from '../../support/host.ts'
import { answers, Child, ready, removeFolder } from './child.ts'

export interface AlertmanagerOptions {
  /** Port on 127.0.0.1; default: a free one. It stays the same over stop and start. */
  readonly port?: number
  /** Where it sends all alerts, at once, and their ends too; default: nowhere. */
  readonly webhook?: string
  /** A whole configuration in its own YAML, instead of `webhook`. */
  readonly config?: string
}

/** An alert as `GET /api/v2/alerts` gives it. */
export interface HeldAlert {
  readonly labels: Readonly<Record<string, string>>
  readonly annotations: Readonly<Record<string, string>>
  readonly startsAt: string
  readonly endsAt: string
  readonly generatorURL: string
  readonly status: { readonly state: 'active' | 'suppressed' | 'unprocessed' }
}

const plainConfig = (webhook: string | undefined): string => `
route:
  receiver: all
  group_by: ['...']
  group_wait: 0s
  group_interval: 1s
  repeat_interval: 1h
receivers:
  - name: all
${webhook ? `    webhook_configs: [{ url: '${webhook}', send_resolved: true }]` : ''}
`

/** A real Alertmanager of a test's own; `program` is `inject('alertmanager').program`. */
export class AlertmanagerProcess {
  readonly url: string
  readonly #program: string
  readonly #folder: string
  #child: Child | null = null

  private constructor(program: string, url: string, folder: string) {
    this.#program = program
    this.url = url
    this.#folder = folder
  }

  static async start(program: string, options: AlertmanagerOptions = {}): Promise<AlertmanagerProcess> {
    const port = options.port ?? (await freePort())
    const folder = await scratchFolder('alertmanager')
    await writeFile(join(folder, 'alertmanager.yml'), options.config ?? plainConfig(options.webhook))
    const started = new AlertmanagerProcess(program, `http://127.0.0.1:${port}`, folder)
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
      `--config.file=${join(this.#folder, 'alertmanager.yml')}`,
      `--storage.path=${join(this.#folder, 'data')}`,
      `--web.listen-address=${this.url.slice('http://'.length)}`,
      '--cluster.listen-address=',
    ]
    this.#child = new Child(this.#program, args, this.#folder)
    await ready(this.#child, 'Alertmanager', () => answers(`${this.url}/-/ready`))
  }

  alerts(): Promise<HeldAlert[]> {
    return heldAlerts(this.url)
  }

  get output(): string {
    return this.#child?.output ?? ''
  }

  async dispose(): Promise<void> {
    await this.#child?.kill()
    await removeFolder(this.#folder)
  }
}

/** The alerts that an Alertmanager holds as not ended, those that match `filter` such as `team="risk"` only. */
export async function heldAlerts(url: string, filter?: string): Promise<HeldAlert[]> {
  const query = filter ? `?filter=${encodeURIComponent(filter)}` : ''
  const response = await fetch(`${url}/api/v2/alerts${query}`)
  if (!response.ok) throw new Error(`Alertmanager answered ${response.status}: ${await response.text()}`)
  return (await response.json()) as HeldAlert[]
}
