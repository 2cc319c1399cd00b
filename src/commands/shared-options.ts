import { type Command, InvalidArgumentError, Option } from 'commander'
import { type LogLevel, logLevels, type SharedOptions, type Surroundings } from './commands.ts'

const defaultSettingsPath = 'tautline.yaml'

interface GlobalFlags {
  readonly settings: string
  readonly logLevel: LogLevel
  readonly json?: true
}

export function addGlobalOptions(program: Command): void {
  program
    .option('--settings <FILE>', 'the settings, YAML', defaultSettingsPath)
    .addOption(
      new Option('--log-level <LEVEL>', 'how much is logged on stderr').choices(logLevels).default('info'),
    )
    .option('--json', 'records for machines on stdout, one JSON object a line')
}

export function sharedOptions(
  flags: GlobalFlags,
  io: Surroundings,
): SharedOptions & { settingsPath: string } {
  return { settingsPath: flags.settings, logLevel: flags.logLevel, json: flags.json === true, io }
}

/** An option's value as a whole number within bounds. */
export const wholeNumber =
  (least: number, most: number) =>
  (written: string): number => {
    const value = Number(written)
    if (!/^\d{1,15}$/.test(written) || value < least || value > most)
      throw new InvalidArgumentError(`It must be a whole number from ${least} to ${most}.`)
    return value
  }

/** An option's value as a number within bounds. */
export const number =
  (least: number, most: number) =>
  (written: string): number => {
    const value = Number(written)
    if (!/^\d+(\.\d+)?$/.test(written) || value < least || value > most)
      throw new InvalidArgumentError(`It must be a number from ${least} to ${most}.`)
    return value
  }

export const everyOption = () =>
  new Option('--every <N>', 'with --json, one frame record every N frames')
    .argParser(wholeNumber(1, 1_000_000_000))
    .default(1)

/** Examples below the help of a command. */
export const examples = (...lines: readonly string[]): string =>
  `\nExamples:\n${lines.map((line) => `  $ ${line}`).join('\n')}`
