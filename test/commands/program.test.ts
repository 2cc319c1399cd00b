import { mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { errorCatalogue, TautlineError } from '../../src/errors.ts'
import { runLine, version } from './surroundings.ts'

let folder: string
let settings: string
beforeAll(() => {
  folder = mkdtempSync(join(tmpdir(), 'tautline-commands-'))
  settings = join(folder, 'desk.yaml')
  writeFileSync(
    settings,
    `ensembles: { desk: { signals: [A, B], clock: { step: 5s }, window: { frames: 20 } } }
feeds: { ticks: { file: { path: a.ndjson }, format: senml }, closes: { file: { path: b.csv }, format: { csv: wide, time: date } } }
routes: { hook: { webhook: { url: "https://hooks.example/", secret: "\${HOOK}" } } }
`,
  )
})
afterAll(() => rmSync(folder, { recursive: true }))

const env = { HOOK: 'hunter22hunter22hunter22' }

describe('the command line', () => {
  it('prints its help with examples, and its version', async () => {
    const help = await runLine(['--help'])
    expect(help).toMatchObject({ status: 0, stderr: '' })
    for (const word of [
      'watch',
      'replay',
      'check',
      'explain',
      'demo',
      '--settings',
      '--log-level',
      '--json',
      'Examples:',
    ])
      expect(help.stdout).toContain(word)
    expect(await runLine(['--version'])).toMatchObject({ status: 0, stdout: `tautline ${version}\n` })
  })

  it.each(['watch', 'replay', 'check', 'explain', 'demo'])(
    '%s --help gives examples and the global options',
    async (name) => {
      const help = await runLine([name, '--help'])
      expect(help.status).toBe(0)
      expect(help.stdout).toContain('Examples:')
      expect(help.stdout).toContain('--settings <FILE>')
    },
  )

  it('without a command prints its help on stderr, with status 1', async () => {
    const ran = await runLine([])
    expect(ran).toMatchObject({ status: 1, stdout: '' })
    expect(ran.stderr).toContain('Usage: tautline')
  })

  it('takes global options before and behind the command', async () => {
    for (const args of [
      ['--settings', settings, '--json', '--log-level', 'debug', 'watch'],
      ['watch', '--settings', settings, '--json', '--log-level', 'debug'],
    ]) {
      const { calls } = await runLine(args, { env })
      expect(calls).toMatchObject([
        ['watch', { settingsPath: settings, json: true, logLevel: 'debug', every: 1 }],
      ])
    }
  })

  it('gives each command its options', async () => {
    const at = ['--settings', settings]
    const called = async (...args: string[]) => (await runLine([...args, ...at], { env })).calls[0]
    expect(await called('watch', '--every', '12')).toMatchObject([
      'watch',
      { every: 12, json: false, logLevel: 'info' },
    ])
    expect(
      await called(
        'replay',
        '--from',
        'c.csv',
        '--as',
        'closes',
        '--expect-steady',
        '--every',
        '5',
        '--report',
        'r.json',
      ),
    ).toMatchObject([
      'replay',
      {
        from: {
          feed: 'closes',
          settings: { file: { path: join(process.cwd(), 'c.csv') }, format: { csv: 'wide', time: 'date' } },
        },
        expectSteady: true,
        every: 5,
        report: 'r.json',
      },
    ])
    expect(await called('replay')).toMatchObject([
      'replay',
      { from: null, expectSteady: false, report: null },
    ])
    expect(await called('replay', '--from', '-', '--as', 'ticks')).toMatchObject([
      'replay',
      { from: { feed: 'ticks', settings: { stdin: {}, format: 'senml' } } },
    ])
    expect(await called('check', '--trial-alert')).toMatchObject(['check', { trialAlert: true }])
    expect(await called('explain', 'desk/3')).toMatchObject([
      'explain',
      { subject: 'desk/3', quarantine: false },
    ])
    expect(await called('explain', '--quarantine')).toMatchObject([
      'explain',
      { subject: null, quarantine: true },
    ])
    const demo = await runLine(['demo', '--speed', '60', '--port', '0', '--open'])
    expect(demo.calls).toMatchObject([['demo', { speed: 60, port: 0, open: true }]])
  })

  it('passes on the status of the command', async () => {
    const ran = await runLine(['replay', '--settings', settings], {
      env,
      commands: { replay: async () => 3 },
    })
    expect(ran.status).toBe(3)
  })
})

describe('a mistake on the command line', () => {
  it.each([
    [['wach'], 'Did you mean watch?'],
    [['watch', '--setings', 'a.yaml'], 'Did you mean --settings?'],
    [['replay', '--expect-stead'], 'Did you mean --expect-steady?'],
    [['check', '--trial'], 'Did you mean --trial-alert?'],
    [['watch', 'now'], "Too many arguments for 'watch'"],
    [['watch', '--every', 'often'], 'a whole number from 1'],
    [['watch', '--every', '0'], 'a whole number from 1'],
    [['demo', '--speed', 'fast'], 'a number from 1 to 10000'],
    [['demo', '--port', '70000'], 'a whole number from 0 to 65535'],
    [['watch', '--log-level', 'loud'], 'error, warn, info, debug'],
    [['watch', '--settings'], 'argument missing'],
    [['replay', '--as', 'ticks', '--settings', 'SETTINGS'], '--as goes with --from'],
    [['replay', '--from', 'x', '--settings', 'SETTINGS'], '--as (ticks, closes)'],
    [['replay', '--from', 'x', '--as', 'tick', '--settings', 'SETTINGS'], 'no feed of this name'],
    [['explain', 'desk', '--quarantine', '--settings', 'SETTINGS'], 'not both'],
  ])('%j is told as `usage`, with what is near, without a stack, status 1', async (args, words) => {
    const ran = await runLine(
      args.map((arg) => (arg === 'SETTINGS' ? settings : arg)),
      { env },
    )
    expect(ran.status).toBe(1)
    expect(ran.calls).toEqual([])
    expect(ran.stderr).toContain('(usage)')
    expect(ran.stderr).toContain(words)
    expect(ran.stderr).toContain(errorCatalogue.usage.remedy)
    expect(ran.stderr).not.toMatch(/^\s+at /m)
    expect(ran.stdout).toBe('')
  })

  it('with --json is also one record on stdout', async () => {
    const ran = await runLine(['wach', '--json'])
    expect(JSON.parse(ran.stdout)).toMatchObject({ type: 'error', code: 'usage', problems: [] })
    expect(ran.stdout.startsWith('{"type":"error"')).toBe(true)
  })
})

describe('settings that cannot be used', () => {
  it('are told with place and remedy; status 1, but 2 from check', async () => {
    const wrong = join(folder, 'wrong.yaml')
    writeFileSync(
      wrong,
      'ensembles: { desk: { signals: [A, B], clock: { step: 5s }, windw: { frames: 20 } } }\npage: { prt: 1 }\n',
    )
    for (const [command, status] of [
      ['watch', 1],
      ['replay', 1],
      ['explain', 1],
      ['check', 2],
    ] as const) {
      const ran = await runLine([command, '--settings', wrong])
      expect(ran.status).toBe(status)
      expect(ran.calls).toEqual([])
      expect(ran.stderr).toContain(`${wrong}:1:60: ensembles.desk.windw`)
      expect(ran.stderr).toContain(`${wrong}:2:9: page.prt`)
      expect(ran.stderr).toContain('2 errors in')
      expect(ran.stderr).not.toMatch(/^\s+at /m)
    }
    const { stdout } = await runLine(['check', '--settings', wrong, '--json'])
    expect(JSON.parse(stdout)).toMatchObject({
      type: 'error',
      code: 'settings-wrong',
      problems: [
        { code: 'settings-unknown-key', line: 1, column: 60, key: 'ensembles.desk.windw', nearest: 'window' },
        { key: 'page.prt' },
      ],
    })
  })

  it('beyond fifty are counted, not printed', async () => {
    const wrong = join(folder, 'many.yaml')
    writeFileSync(wrong, Array.from({ length: 70 }, (_, i) => `k${i}: 1\n`).join(''))
    const { stderr } = await runLine(['watch', '--settings', wrong])
    expect(stderr.match(/many\.yaml:\d+:\d+:/g)).toHaveLength(50)
    expect(stderr).toContain('… and 21 more')
    expect(stderr).toContain('71 errors in')
  })

  it('a settings file that is not there is `settings-missing`', async () => {
    const ran = await runLine(['check', '--settings', join(folder, 'none.yaml')])
    expect(ran.status).toBe(2)
    expect(ran.stderr).toContain('(settings-missing)')
  })
})

describe('an error of a command', () => {
  const failing = (error: unknown, ...more: string[]) =>
    runLine(['watch', '--settings', settings, ...more], {
      env,
      commands: {
        watch: async () => {
          throw error
        },
      },
    })

  it('of the catalogue is printed as code, sentence, detail and remedy', async () => {
    const ran = await failing(new TautlineError('store-foreign', '/tmp/a.db'))
    expect(ran.status).toBe(1)
    expect(ran.stderr).toBe(
      `tautline: ${errorCatalogue['store-foreign'].sentence} (store-foreign)\n  /tmp/a.db\n  ${errorCatalogue['store-foreign'].remedy}\n`,
    )
  })

  it('that nobody foresaw is a `defect`, its stack shown at log level debug alone', async () => {
    const quiet = await failing(new RangeError('index 9 of 3'))
    expect(quiet.stderr).toContain('(defect)')
    expect(quiet.stderr).toContain('RangeError: index 9 of 3')
    expect(quiet.stderr).not.toMatch(/^\s+at /m)
    expect((await failing(new RangeError('index'), '--log-level', 'debug')).stderr).toMatch(/^\s+at /m)
  })

  it('never shows a secret of the settings', async () => {
    const ran = await failing(new Error(`refused with ${env.HOOK}`), '--json', '--log-level', 'debug')
    expect(ran.stderr + ran.stdout).toContain('[hidden]')
    expect(ran.stderr + ran.stdout).not.toContain('hunter22')
  })
})
