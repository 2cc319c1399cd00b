import type { FormatSettings } from '../settings/schema.ts'
import { CsvReader } from './csv-reader.ts'
import { eitherTime, jsonReader, timeRule } from './json-reader.ts'
import { JsonScanner } from './json-scanner.ts'
import { LineReader } from './line-reader.ts'
import type { NameTable } from './name-table.ts'
import type { RecordReader } from './record-reader.ts'
import { senmlReader } from './senml-reader.ts'

const plainStep = /^\/[^/~]*$/

/**
 * The reader of a format. `limit`: longest record in bytes. `fast: false` leaves out the byte scanner, for
 * tests that hold both ways against each other.
 */
export function readerFor(
  format: FormatSettings,
  limit: number,
  names: NameTable,
  { fast = true } = {},
): RecordReader {
  if (format === 'senml')
    return new LineReader({ limit, document: senmlReader, scanner: null, linesInMessages: false })
  if (format !== 'ndjson' && 'csv' in format) return new CsvReader(format, limit)
  const ndjson = format === 'ndjson'
  const rule = ndjson ? eitherTime : timeRule(format.unit)
  const pointers = ndjson
    ? { signal: '/signal', time: '/time', value: '/value', readings: null }
    : { ...format, readings: format.readings ?? null }
  const flat = [pointers.signal, pointers.time, pointers.value].every((pointer) => plainStep.test(pointer))
  const scanner =
    fast && flat && pointers.readings === null
      ? JsonScanner.for(
          pointers.signal.slice(1),
          pointers.time.slice(1),
          pointers.value.slice(1),
          rule,
          names,
        )
      : null
  return new LineReader({ limit, document: jsonReader(pointers, rule), scanner, linesInMessages: ndjson })
}
