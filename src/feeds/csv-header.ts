import { escapeText } from './escape.ts'
import type { TimeUnit } from './times.ts'

export type CsvFormat =
  | { readonly csv: 'wide'; readonly time: string; readonly unit: TimeUnit }
  | {
      readonly csv: 'long'
      readonly time: string
      readonly signal: string
      readonly value: string
      readonly unit: TimeUnit
    }

/** What is where in the rows. */
export interface CsvHeader {
  readonly columns: number
  readonly time: number
  /** Long: columns of the name and of the value; -1 in wide. */
  readonly signal: number
  readonly value: number
  /** Wide: number of the signal in each column; negative: none. */
  readonly signals: Int32Array
}

/** Why a header line with these names does not fit the format, or null. */
export function headerFault(names: readonly string[], format: CsvFormat): string | null {
  const wanted = format.csv === 'wide' ? [format.time] : [format.time, format.signal, format.value]
  const missing = wanted.find((name) => !names.includes(name))
  if (missing !== undefined) return `There is no column "${missing}"; ${listed(names)}.`
  const mustDiffer = format.csv === 'wide' ? names : names.filter((name) => wanted.includes(name))
  const seen = new Set<string>()
  for (const name of mustDiffer) {
    if (seen.has(name)) return `The column ${quoted(name)} stands more than once.`
    seen.add(name)
  }
  return null
}

const quoted = (name: string): string => `"${escapeText(name.slice(0, 80))}"`

function listed(names: readonly string[]): string {
  const shown = names.slice(0, 12).map(quoted)
  const more = names.length > shown.length ? ` and ${names.length - shown.length} more` : ''
  return `the header has ${shown.join(', ')}${more}`
}
