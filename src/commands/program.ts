import { Command, CommanderError } from 'commander'
import { TautlineError } from '../errors.ts'
import { nearest } from '../settings/nearest.ts'
import { type ReadSettings, readSettings } from '../settings/read-settings.ts'
import type { Commands, ExitStatus, SettledOptions, SharedOptions, Surroundings } from './commands.ts'
import { printError, SettingsWrong } from './print-error.ts'
import { replayFeed } from './replay-feed.ts'
import {
  addGlobalOptions,
  everyOption,
  examples,
  number,
  sharedOptions,
  wholeNumber,
} from './shared-options.ts'

/**
 * The command line over the given commands. `run` parses the arguments (without the program's name) and
 * resolves to the exit status; it prints every error and never rejects.
 */
export function program(commands: Commands, version: string, io: Surroundings) {
  return {
    async run(args: readonly string[]): Promise<ExitStatus> {
      const session = new Session(io)
      const tree = commandTree(commands, version, session)
      try {
        await tree.parseAsync([...args], { from: 'user' })
        return session.status
      } catch (error) {
        if (error instanceof CommanderError && error.exitCode === 0) return 0
        if (error instanceof CommanderError && error.code === 'commander.help') return 1
        const shown = error instanceof CommanderError ? usageError(error, tree, args) : error
        printError(shown, session.options(tree.opts()), (text) => session.redact(text))
        return error instanceof SettingsWrong && session.isCheck ? 2 : 1
      }
    },
  }
}

/** What one run of the command line has found out. */
class Session {
  status: ExitStatus = 0
  isCheck = false
  readonly io: Surroundings
  #read: ReadSettings | null = null

  constructor(io: Surroundings) {
    this.io = io
  }

  options(flags: Record<string, unknown>): SharedOptions & { settingsPath: string } {
    return sharedOptions(flags as never, this.io)
  }

  /** Options with the settings read; throws `SettingsWrong`. */
  settled(flags: Record<string, unknown>): SettledOptions {
    const shared = this.options(flags)
    const read = readSettings(shared.settingsPath, this.io.env)
    if (!read.ok) throw new SettingsWrong(read.error)
    this.#read = read.value
    return { ...shared, read: read.value }
  }

  redact(text: string): string {
    return this.#read?.secrets.redact(text) ?? text
  }
}

function commandTree(commands: Commands, version: string, session: Session): Command {
  const tree = new Command('tautline')
  tree
    .description('Watches how many signals move together, and calls when that changes.')
    .version(`tautline ${version}`, '--version', 'print the version')
    .helpOption('-h, --help', 'print this help')
    .helpCommand(false)
    .exitOverride()
    .showSuggestionAfterError(false)
    .configureHelp({ showGlobalOptions: true, sortSubcommands: false })
    .configureOutput({
      writeOut: (text) => session.io.stdout.write(text),
      writeErr: (text) => session.io.stderr.write(text),
      outputError: () => {},
    })
    .addHelpText(
      'after',
      examples(
        'tautline demo --open',
        'tautline check --settings config/desk.yaml',
        'tautline watch --settings config/desk.yaml',
        'tautline replay --settings config/desk.yaml --from ticks.ndjson.gz --json > records.ndjson',
        'tautline watch --help',
      ),
    )
  addGlobalOptions(tree)
  addWatch(tree, commands, session)
  addReplay(tree, commands, session)
  addCheck(tree, commands, session)
  addExplain(tree, commands, session)
  addDemo(tree, commands, session)
  return tree
}

function addWatch(tree: Command, commands: Commands, session: Session): void {
  tree
    .command('watch')
    .description('run the monitor on live feeds until it is told to stop (SIGTERM, Ctrl-C)')
    .addOption(everyOption())
    .addHelpText(
      'after',
      examples(
        'tautline watch --settings config/desk.yaml',
        'tautline watch --settings config/plant.yaml --json --every 12',
      ),
    )
    .action(async (flags, command: Command) => {
      session.status = await commands.watch({
        ...session.settled(command.optsWithGlobals()),
        every: flags.every,
      })
    })
}

function addReplay(tree: Command, commands: Commands, session: Session): void {
  tree
    .command('replay')
    .description('run the same pipeline over recorded readings, as fast as it can')
    .option(
      '--from <FILE>',
      'a recorded file (- for standard input) in place of the file feeds of the settings',
    )
    .option('--as <FEED>', 'with --from, the feed of the settings whose format the file has')
    .addOption(everyOption())
    .option('--expect-steady', 'exit with status 3 when a regime shifted')
    .option('--report <FILE>', 'write a report of the run, as JSON')
    .addHelpText(
      'after',
      examples(
        'tautline replay --settings config/desk.yaml --from ticks.ndjson.gz',
        'tautline replay --settings closes.yaml --json --every 20 > records.ndjson',
        'tautline replay --settings config/plant.yaml --from quiet-week.csv --expect-steady --report report.json',
      ),
    )
    .action(async (flags, command: Command) => {
      const settled = session.settled(command.optsWithGlobals())
      if (flags.as !== undefined && flags.from === undefined)
        throw new TautlineError('usage', '--as goes with --from.')
      const from =
        flags.from === undefined ? null : replayFeed(settled.read.settings, flags.from, flags.as ?? null)
      if (from !== null && !from.ok) throw from.error
      session.status = await commands.replay({
        ...settled,
        from: from?.value ?? null,
        every: flags.every,
        expectSteady: flags.expectSteady === true,
        report: flags.report ?? null,
      })
    })
}

function addCheck(tree: Command, commands: Commands, session: Session): void {
  tree
    .command('check')
    .description('read the settings and try every file, feed and route, without starting')
    .option('--trial-alert', 'send an alert that is marked as a trial through every route')
    .addHelpText(
      'after',
      examples(
        'tautline check --settings config/desk.yaml',
        'tautline check --settings config/desk.yaml --trial-alert',
      ),
    )
    .action(async (flags, command: Command) => {
      session.isCheck = true
      const settled = session.settled(command.optsWithGlobals())
      session.status = await commands.check({ ...settled, trialAlert: flags.trialAlert === true })
    })
}

function addExplain(tree: Command, commands: Commands, session: Session): void {
  tree
    .command('explain')
    .argument(
      '[ALERT-OR-REGIME]',
      'ENSEMBLE, ENSEMBLE/SHIFT or the whole id of an alert; none: list what there is',
    )
    .description('show one alert or regime in full: evidence, who carries it, spectra, certificate')
    .option('--quarantine', 'show the records that could not be read, newest first')
    .option(
      '--reference <FILE>',
      'write the present reference of the ensemble, for `reference: { from: FILE }`',
    )
    .addHelpText(
      'after',
      examples(
        'tautline explain --settings config/desk.yaml',
        'tautline explain desk/3 --settings config/desk.yaml',
        'tautline explain --quarantine --settings config/desk.yaml --json',
        'tautline explain desk --reference quiet.json --settings config/desk.yaml',
      ),
    )
    .action(async (subject: string | undefined, flags, command: Command) => {
      const settled = session.settled(command.optsWithGlobals())
      if (subject !== undefined && flags.quarantine)
        throw new TautlineError('usage', 'Give an alert or --quarantine, not both.')
      if (flags.reference !== undefined && (subject === undefined || subject.includes('/')))
        throw new TautlineError('usage', '--reference goes with the name of an ensemble.')
      session.status = await commands.explain({
        ...settled,
        subject: subject ?? null,
        quarantine: flags.quarantine === true,
        reference: flags.reference ?? null,
      })
    })
}

function addDemo(tree: Command, commands: Commands, session: Session): void {
  tree
    .command('demo')
    .description(
      'an invented desk and an invented pumping station, with the page; --settings gives it routes',
    )
    .option('--speed <X>', 'event time over real time', number(1, 10_000), 300)
    .option('--port <N>', 'port of the page on 127.0.0.1', wholeNumber(0, 65_535), 8450)
    .option('--open', 'open the page in a browser')
    .addOption(everyOption())
    .addHelpText('after', examples('tautline demo --open', 'tautline demo --speed 60 --port 9000'))
    .action(async (flags, command: Command) => {
      const given = command.getOptionValueSourceWithGlobals('settings') === 'cli'
      const flagsOfAll = command.optsWithGlobals()
      session.status = await commands.demo({
        ...session.options(flagsOfAll),
        given: given ? session.settled(flagsOfAll).read : null,
        every: flags.every,
        speed: flags.speed,
        port: flags.port,
        open: flags.open === true,
      })
    })
}

/** The parser's error in our words, with the nearest known option or command. */
function usageError(error: CommanderError, tree: Command, args: readonly string[]): TautlineError {
  const words = error.message.replace(/^error: /, '').replace(/\n.*/s, '')
  const [, given = ''] = /'([^']*)'/.exec(words) ?? []
  const command = tree.commands.find((one) => args.includes(one.name()))
  const known =
    error.code === 'commander.unknownOption'
      ? [tree, ...(command ? [command] : [])].flatMap(({ options }) => options.map(({ long }) => long ?? ''))
      : error.code === 'commander.unknownCommand'
        ? tree.commands.map((one) => one.name())
        : []
  const meant = nearest(given, known)
  const sentence = `${words.charAt(0).toUpperCase()}${words.slice(1)}`.replace(/\.?$/, '.')
  return new TautlineError('usage', meant === null ? sentence : `${sentence} Did you mean ${meant}?`)
}
