import { type ErrorCode, errorCatalogue } from '../errors.ts'

/** Way to a value from the top of the file: keys of maps, places in lists from 0. */
export type Path = readonly (string | number)[]

type SettingsCode = Extract<ErrorCode, `settings-${string}`>

/** One thing that is wrong with the settings, or, as a warning, likely not meant. */
export interface SettingsProblem {
  readonly code: SettingsCode
  readonly severity: 'error' | 'warning'
  readonly file: string
  /** From 1. */
  readonly line: number
  /** From 1. */
  readonly column: number
  /** Such as `ensembles.desk.signals[3]`; empty at the top. */
  readonly key: string
  /** What is wrong, in a sentence. */
  readonly sentence: string
  readonly found: string | null
  readonly allowed: string | null
  /** The known word that was most likely meant. */
  readonly nearest: string | null
}

/** What is wrong, before its place in the file is looked up. */
export interface Fault {
  readonly code: SettingsCode
  readonly path: Path
  /** Whether the key or the value is to be pointed at. */
  readonly at: 'key' | 'value'
  readonly sentence: string
  readonly severity?: 'warning'
  readonly allowed?: string
  readonly nearest?: string | null
  /** Set where what was found must not be shown. */
  readonly hidden?: boolean
}

/** `ensembles.desk.signals[3]` */
export function keyText(path: Path): string {
  let written = ''
  for (const step of path) {
    if (typeof step === 'number') written += `[${step}]`
    else if (/^[\w-]+$/.test(step)) written += written === '' ? step : `.${step}`
    else written += `[${JSON.stringify(step.length > 60 ? `${step.slice(0, 59)}…` : step)}]`
  }
  return written
}

export const inOrder = (problems: readonly SettingsProblem[]): SettingsProblem[] =>
  [...problems].sort((a, b) => a.line - b.line || a.column - b.column || (a.key < b.key ? -1 : 1))

/** A problem as lines for people, the first one `FILE:LINE:COLUMN: KEY: sentence`. */
export function problemLines(problem: SettingsProblem): string[] {
  const { file, line, column, key, sentence, found, allowed, nearest, code, severity } = problem
  const head = `${file}:${line}:${column}: ${key === '' ? '' : `${key}: `}${severity === 'warning' ? 'Warning: ' : ''}${sentence}`
  return [
    head,
    ...(found === null ? [] : [`    found:   ${found}`]),
    ...(nearest === null ? [] : [`    meant?   ${nearest}`]),
    ...(allowed === null ? [] : [`    allowed: ${allowed}`]),
    ...(severity === 'warning' ? [] : [`    ${errorCatalogue[code].remedy} (${code})`]),
  ]
}
