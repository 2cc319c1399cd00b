import type { Writable } from 'node:stream'
import type { ReadSettings } from '../settings/read-settings.ts'
import type { FeedSettings } from '../settings/schema.ts'
import type { Environment } from '../settings/substitution.ts'

/** 0 done; 1 failed; 2 settings wrong (`check`); 3 a regime shifted (`replay --expect-steady`). */
export type ExitStatus = 0 | 1 | 2 | 3

export const logLevels = ['error', 'warn', 'info', 'debug'] as const
export type LogLevel = (typeof logLevels)[number]

/** What a command may touch of the process. Records and tables go to `stdout`, everything else to `stderr`. */
export interface Surroundings {
  readonly stdout: Writable & { readonly isTTY?: boolean }
  readonly stderr: Writable & { readonly isTTY?: boolean }
  readonly env: Environment
  /** Milliseconds since 1970 UTC. */
  now(): number
}

export interface SharedOptions {
  readonly json: boolean
  readonly logLevel: LogLevel
  readonly io: Surroundings
}

/** Options of a command that works on settings that were read and found right. */
export interface SettledOptions extends SharedOptions {
  readonly settingsPath: string
  readonly read: ReadSettings
}

export interface WatchOptions extends SettledOptions {
  /** With `json`, every so many frames one `frame` record. */
  readonly every: number
}

export interface ReplayOptions extends SettledOptions {
  /** The recorded file that takes the place of the settings' feeds; null: their file feeds are replayed. */
  readonly from: { readonly feed: string; readonly settings: FeedSettings } | null
  readonly every: number
  readonly expectSteady: boolean
  /** File to which the report is written; null for none. */
  readonly report: string | null
}

export interface CheckOptions extends SettledOptions {
  readonly trialAlert: boolean
}

export interface ExplainOptions extends SettledOptions {
  /** `ENSEMBLE`, `ENSEMBLE/SHIFT` or a whole alert id; null: what there is to explain. */
  readonly subject: string | null
  readonly quarantine: boolean
  /** File to which the present reference of the ensemble `subject` is written; null for none. */
  readonly reference: string | null
}

export interface DemoOptions extends SharedOptions {
  /** Event time over real time. */
  readonly speed: number
  readonly port: number
  /** Whether to open the page in a browser. */
  readonly open: boolean
  /** Settings whose routes, heartbeat, store and page are used; null where none were given. */
  readonly given: ReadSettings | null
  /** With `json`, every so many frames one `frame` record. */
  readonly every: number
}

/** What stands behind the command line. A rejection with a `TautlineError` is printed for the user. */
export interface Commands {
  watch(options: WatchOptions): Promise<ExitStatus>
  replay(options: ReplayOptions): Promise<ExitStatus>
  check(options: CheckOptions): Promise<ExitStatus>
  explain(options: ExplainOptions): Promise<ExitStatus>
  demo(options: DemoOptions): Promise<ExitStatus>
}

/** Writes one record, `type` first, as a line of NDJSON. */
export function writeRecord(
  out: Writable,
  record: { readonly type: string } & Readonly<Record<string, unknown>>,
): void {
  out.write(`${JSON.stringify(record)}\n`)
}
