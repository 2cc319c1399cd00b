import { type ErrorCode, errorCatalogue, TautlineError } from '../errors.ts'
import { problemLines, type SettingsProblem } from '../settings/problem.ts'
import { type SharedOptions, writeRecord } from './commands.ts'

/** Most problems of one file that are printed; the first ones are the likeliest causes. */
const mostPrinted = 50

/** What is wrong with the settings file, as one error of the command. */
export class SettingsWrong extends TautlineError {
  readonly problems: readonly SettingsProblem[]

  constructor(problems: readonly SettingsProblem[]) {
    const isMissing = problems.some(({ code }) => code === 'settings-missing')
    const errors = problems.filter(({ severity }) => severity === 'error').length
    const detail = isMissing
      ? `${problems[0]!.file}: ${problems[0]!.sentence}`
      : `${errors} ${errors === 1 ? 'error' : 'errors'} in ${problems[0]?.file}.`
    super(isMissing ? 'settings-missing' : 'settings-wrong', detail)
    this.problems = isMissing ? [] : problems
  }
}

/**
 * Prints an error for the user on stderr: code, sentence, detail, remedy, and never a stack, but for a
 * defect of the program at log level `debug`. With `json` also as an `error` record on stdout.
 */
export function printError(error: unknown, options: SharedOptions, redact: (text: string) => string): void {
  const { io, json, logLevel } = options
  const known = asTautlineError(error)
  const { sentence } = errorCatalogue[known.code]
  const problems = known instanceof SettingsWrong ? known.problems : []
  const lines = [
    ...problems.slice(0, mostPrinted).flatMap(problemLines),
    ...(problems.length > mostPrinted ? [`… and ${problems.length - mostPrinted} more`] : []),
    `tautline: ${sentence} (${known.code})`,
    ...(known.detail === '' ? [] : [`  ${known.detail}`]),
    `  ${known.remedy}`,
  ]
  if (known.code === 'defect' && logLevel === 'debug' && error instanceof Error) lines.push(error.stack ?? '')
  io.stderr.write(redact(`${lines.join('\n')}\n`))
  if (!json) return
  const { code, detail, remedy } = known
  const record = { type: 'error', code, sentence, detail, remedy, problems }
  writeRecord(io.stdout, JSON.parse(redact(JSON.stringify(record))))
}

function asTautlineError(error: unknown): TautlineError & { code: ErrorCode } {
  if (error instanceof TautlineError) return error
  const words = error instanceof Error ? `${error.name}: ${error.message}` : String(error)
  return new TautlineError('defect', words, { cause: error })
}
