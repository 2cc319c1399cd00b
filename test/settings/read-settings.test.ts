import { mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join, resolve } from 'node:path'
import { fileURLToPath } from 'node:url'
import fc from 'fast-check'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { deskSignals } from '../../demo-feeds/desk.ts'
import { stationSignals } from '../../demo-feeds/station.ts'
import { errorCatalogue } from '../../src/errors.ts'
import { matchesGlob } from '../../src/frames/glob.ts'
import { Sessions } from '../../src/frames/sessions.ts'
import { limitNames } from '../../src/settings/ensemble-checks.ts'
import { faultsOf } from '../../src/settings/faults.ts'
import { parseSettings, readSettings } from '../../src/settings/read-settings.ts'
import { parseDays } from '../../src/settings/scalars.ts'
import { settingsSchema } from '../../src/settings/schema.ts'

const sound = `ensembles:
  desk:
    signals: [A, B]
    clock: { step: 5s }
    window: { frames: 20 }
`
const parse = (text: string, env: Readonly<Record<string, string>> = {}) =>
  parseSettings('desk.yaml', text, env)

function settingsOf(text: string, env: Readonly<Record<string, string>> = {}) {
  const read = parse(text, env)
  if (!read.ok) throw new Error(JSON.stringify(read.error, null, 1))
  return read.value
}

const problemsOf = (text: string, env: Readonly<Record<string, string>> = {}) => {
  const read = parse(text, env)
  return read.ok ? read.value.warnings : read.error
}

let folder: string
beforeAll(() => {
  folder = mkdtempSync(join(tmpdir(), 'tautline-settings-'))
})
afterAll(() => rmSync(folder, { recursive: true }))

describe('settings that are right', () => {
  it('become one object with every default filled in, durations in milliseconds', () => {
    const { settings } = settingsOf(sound)
    expect(settings.ensembles.desk).toEqual({
      signals: ['A', 'B'],
      clock: { step: 5000, lateness: 0, 'idle-after': 30_000, ahead: 86_400_000 },
      increment: 'log-return',
      memory: 'none',
      window: { frames: 20 },
      reference: { frames: 600 },
      scale: 'correlation',
      'common-volatility': 'remove',
      truncate: { at: 5 },
      level: 0.01,
      limits: { 'false-pages': { pages: 1, per: 90 * 86_400_000 } },
      planned: [],
    })
    expect(settings.page).toEqual({ listen: '127.0.0.1:8450' })
    expect(settings.store).toEqual({ path: resolve('state/tautline.db'), every: 5000, quarantine: 1000 })
  })

  it('are YAML 1.2: `off`, times of day and dates are texts', () => {
    const { settings } = settingsOf(`ensembles:
  desk:
    signals: [on, no, y]
    clock: { step: row, sessions: { zone: Europe/Oslo, open: 09:00, close: 16:20, holidays: [2026-12-25] } }
    window: { half-life: 50 }
    truncate: off
    reference: { since: 2026-11-02 }
`)
    expect(settings.ensembles.desk).toMatchObject({
      signals: ['on', 'no', 'y'],
      truncate: 'off',
      clock: { step: 'row', sessions: { open: '09:00', days: 'mon-fri', holidays: ['2026-12-25'] } },
      reference: { since: '2026-11-02', frames: 600 },
    })
  })

  it('may share parts by anchor and alias', () => {
    const { settings } = settingsOf(`ensembles:
  a: &a { signals: [A, B], clock: &c { step: 5s }, window: { frames: 20 } }
  b: *a
  c: { signals: [C, D], clock: *c, window: { frames: 20 } }
`)
    expect(settings.ensembles.b).toEqual(settings.ensembles.a)
    expect(settings.ensembles.c?.clock.step).toBe(5000)
  })

  it('count the paths of files from the folder of the settings file', () => {
    const path = join(folder, 'inner.yaml')
    writeFileSync(
      path,
      `ensembles:
  desk: { signals: { file: names.txt }, clock: { step: row }, window: { frames: 20 }, reference: { from: ../quiet.json } }
feeds:
  f: { file: { path: data/closes.csv.gz } }
  k: { kafka: { brokers: ["127.0.0.1:9"], topic: t, group: g, tls: { ca: ca.pem } } }
routes:
  k: { kafka: { brokers: ["127.0.0.1:9"], topic: t, tls: { key: /etc/key.pem } } }
store: { path: state/a.db }
`,
    )
    const read = readSettings(path, {})
    expect(read.ok && read.value.settings).toMatchObject({
      ensembles: {
        desk: {
          signals: { file: join(folder, 'names.txt') },
          reference: { from: resolve(folder, '../quiet.json') },
        },
      },
      feeds: {
        f: { file: { path: join(folder, 'data/closes.csv.gz') } },
        k: { kafka: { tls: { ca: join(folder, 'ca.pem') } } },
      },
      routes: { k: { kafka: { tls: { key: '/etc/key.pem' } } } },
      store: { path: join(folder, 'state/a.db') },
    })
  })
})

describe('errors', () => {
  it('are told all at once, in the order of the file, those between settings included', () => {
    const problems = problemsOf(`ensembles:
  desk: { signals: [A, B, A], clock: { step: 5s }, window: { frames: 20 } }
  plant: { signals: [A, B], clok: { step: 5s }, window: { frames: 2 } }
feeds: { f: { stdin: {} }, f: { stdin: {} } }
heartbeat: { routes: [nobody] }
page: { token: "\${NOT_SET}", listen: "0.0.0.0:1" }
`)
    expect(problems.map(({ line, key }) => `${line} ${key}`)).toEqual([
      '2 ensembles.desk.signals[2]',
      '3 ensembles.plant.clok',
      '3 ensembles.plant.window.frames',
      '4 feeds.f',
      '5 heartbeat.routes[0]',
      '6 page.token',
    ])
  })

  it.each([
    ['a file that is not there', 'none.yaml', null, 'settings-missing'],
    ['a file longer than 1 MiB', 'long.yaml', Buffer.alloc(1024 * 1024 + 1, '#'), 'settings-syntax'],
    [
      'a file that is not UTF-8',
      'latin.yaml',
      Buffer.from([0x61, 0x3a, 0x20, 0xe9, 0x0a]),
      'settings-syntax',
    ],
    ['a folder', '.', null, 'settings-missing'],
  ])('%s is one coded error', (_, name, content, code) => {
    const path = join(folder, name)
    if (content) writeFileSync(path, content)
    const read = readSettings(path, {})
    expect(read.ok ? [] : read.error.map((problem) => problem.code)).toEqual([code])
  })

  it('an alias that writes itself out without end is refused, quickly and without much memory', () => {
    const levels = Array.from({ length: 12 }, (_, i) =>
      i === 0
        ? 'a0: &a0 [x, x, x, x, x, x, x, x, x, x]'
        : `a${i}: &a${i} [${Array(10)
            .fill(`*a${i - 1}`)
            .join(', ')}]`,
    )
    const problems = problemsOf(`${levels.join('\n')}\n`)
    expect(problems.some(({ sentence }) => sentence.includes('more than 200000 values'))).toBe(true)
  })

  it.each([
    ['brackets', '['.repeat(500_000)],
    ['maps', '{a: '.repeat(100_000)],
    ['list marks', '- '.repeat(200_000)],
    ['indentation', Array.from({ length: 1300 }, (_, i) => `${' '.repeat(i)}k:`).join('\n')],
  ])('%s nested without end are one error, at once', (_, text) => {
    expect(problemsOf(text).map(({ code }) => code)).toEqual(['settings-syntax'])
  })

  it('a key that JavaScript knows is a key like any other', () => {
    expect(
      problemsOf(`${sound}__proto__: { page: 1 }\nconstructor: 2\n`).map(({ key, code }) => `${code} ${key}`),
    ).toContain('settings-unknown-key __proto__')
    expect(({} as Record<string, unknown>).page).toBeUndefined()
  })
})

describe('warnings', () => {
  const routed = `routes: { r: { log: {} } }\nheartbeat: {}\nfeeds: { f: { stdin: {} } }\n`
  it('are none for settings that leave nothing to doubt', () => {
    expect(problemsOf(sound + routed)).toEqual([])
  })

  it.each([
    [
      'fewer frames than signals',
      sound.replace('[A, B]', `[${Array.from({ length: 30 }, (_, i) => `S${i}`)}]`) + routed,
      'ensembles.desk.window',
    ],
    [
      'a reference shorter than the window',
      `${sound}    reference: { frames: 16 }\n${routed}`,
      'ensembles.desk.reference',
    ],
    ['amplitudes looked for and removed', `${sound}    scale: covariance\n${routed}`, 'ensembles.desk.scale'],
    [
      'verdicts a hundred frames late',
      sound.replace('step: 5s', 'step: 5s, lateness: 10m') + routed,
      'ensembles.desk.clock.lateness',
    ],
    [
      'a feed that nobody reads',
      `${sound}    feeds: [f]\nfeeds: { f: { stdin: {} }, g: { file: { path: a } } }\nroutes: { r: { log: {} } }\nheartbeat: {}\n`,
      'feeds.g',
    ],
    ['no feed', `${sound}routes: { r: { log: {} } }\nheartbeat: {}\n`, 'feeds'],
    ['no route', `${sound}feeds: { f: { stdin: {} } }\n`, 'routes'],
    ['no heartbeat', `${sound}feeds: { f: { stdin: {} } }\nroutes: { r: { log: {} } }\n`, 'heartbeat'],
  ])('%s', (_, text, key) => {
    expect(problemsOf(text).map((problem) => `${problem.severity} ${problem.key}`)).toEqual([
      `warning ${key}`,
    ])
  })

  it('states the sight limit 1 + √(N/T): 30 signals in 20 frames see from 2.2 times the noise', () => {
    // Baik, Ben Arous & Péché 2005: 1 + √1.5 = 2.2247.
    const [warning] = problemsOf(
      sound.replace('[A, B]', `[${Array.from({ length: 30 }, (_, i) => `S${i}`)}]`) + routed,
    )
    expect(warning?.sentence).toContain('2.2 times the noise')
  })
})

describe('the environment', () => {
  const hook = (secret: string) =>
    `${sound}routes: { r: { webhook: { url: "https://hooks.example/in", secret: "${secret}" } } }\n`

  it('gives ${NAME} by itself or by the file that NAME_FILE names, less one newline at its end', () => {
    const path = join(folder, 'hook-secret')
    writeFileSync(path, 'from a file, twenty-four\n\n')
    const direct = settingsOf(hook('${HOOK}'), { HOOK: 'straight from the environment' })
    const byFile = settingsOf(hook('${HOOK}'), { HOOK_FILE: path })
    expect(direct.settings.routes.r).toMatchObject({ webhook: { secret: 'straight from the environment' } })
    expect(byFile.settings.routes.r).toMatchObject({ webhook: { secret: 'from a file, twenty-four\n' } })
  })

  it('is put in anywhere inside a text, several times, and $${ stands for itself', () => {
    const { settings } = settingsOf(
      sound.replace('signals', () => 'title: "${A}-${B} $${A}"\n    signals'),
      {
        A: 'x',
        B: '${A}',
      },
    )
    expect(settings.ensembles.desk?.title).toBe('x-${A} ${A}')
  })

  it('lets a secret stand in plain only where every address is loopback', () => {
    const local = hook('a plain secret of some length').replace('https://hooks.example', 'http://127.0.0.1:9')
    expect(settingsOf(local).settings.routes.r).toBeDefined()
  })

  it('keeps every secret out of what is shown', () => {
    const { secrets } = settingsOf(hook('${HOOK}'), { HOOK: 'tell "no" body' })
    expect(secrets.redact('sent with tell "no" body today')).toBe('sent with [hidden] today')
    expect(secrets.redact(JSON.stringify({ a: 'tell "no" body' }))).toBe('{"a":"[hidden]"}')
    expect(secrets.redact(`?key=${encodeURIComponent('tell "no" body')}`)).toBe('?key=[hidden]')
    expect(secrets.redact(Buffer.from('tell "no" body').toString('base64'))).toBe('[hidden]')
  })

  it('shows no secret in any error, also of a file that holds other errors', () => {
    const text = `${hook('${HOOK}')}page: { url: "\${HOOK}", token: hunter22hunter22, listen: "0.0.0.0:1" }\nnonsense: 1\n`
    const shown = JSON.stringify(problemsOf(text, { HOOK: 'never-to-be-shown' }))
    expect(shown).toContain('nonsense')
    expect(shown).not.toContain('never-to-be-shown')
    expect(shown).not.toContain('hunter22')
  })
})

describe('the walk over schema and value', () => {
  const base = () => ({
    ensembles: {
      desk: {
        signals: ['A', 'B'],
        clock: { step: '5s', sessions: { zone: 'UTC', open: '09:00', close: '10:00' } },
        window: { frames: 20 },
        reference: { since: '2026-11-02', frames: 20 },
        truncate: { at: 5 },
        limits: { explicit: { 'leading-share': 1 } },
        planned: [{ from: '2026-11-07T06:00:00Z', to: '2026-11-07T07:00:00Z' }],
      },
    },
    feeds: {
      k: { kafka: { brokers: ['a:1'], topic: 't', group: 'g', tls: true }, format: 'senml' },
      f: { file: { path: 'a' }, format: { csv: 'long', time: 't', signal: 's', value: 'v' } },
    },
    routes: { a: { alertmanager: { urls: ['http://a'] }, labels: { team: 'x' } }, l: { log: {} } },
    heartbeat: { every: '1m' },
    page: { listen: '127.0.0.1:1' },
  })
  type Json = null | boolean | number | string | Json[] | { [key: string]: Json }

  /** Every place of a value, as a way to it. */
  const places = (value: Json, path: (string | number)[] = []): (string | number)[][] => [
    path,
    ...(value !== null && typeof value === 'object'
      ? Object.entries(value).flatMap(([key, inner]) =>
          places(inner as Json, [...path, Array.isArray(value) ? Number(key) : key]),
        )
      : []),
  ]

  it('finds a fault exactly where the schema refuses, whatever is put in or left out', () => {
    const all = places(base() as Json).filter((path) => path.length > 0)
    const odd = fc.oneof(
      fc.constantFrom<Json>(
        null,
        true,
        0,
        -1,
        20,
        1.5,
        '',
        'row',
        'off',
        '5s',
        'senml',
        '${X}',
        [],
        {},
        ['a'],
        { frames: 20 },
      ),
      fc.constantFrom<Json>(
        { csv: 'wide', time: 't' },
        { signal: '/s', time: '/t', value: '/v' },
        { stdin: {} },
        { log: {} },
      ),
      fc.jsonValue({ maxDepth: 2 }) as fc.Arbitrary<Json>,
    )
    const change = fc.record({
      at: fc.constantFrom(...all),
      what: fc.constantFrom('put', 'leave-out', 'add'),
      odd,
    })
    fc.assert(
      fc.property(fc.array(change, { minLength: 1, maxLength: 3 }), (changes) => {
        const value = base() as unknown as Json
        for (const { at, what, odd: item } of changes) {
          let holder: Json | undefined = value
          for (const step of at.slice(0, -1))
            holder =
              holder !== null && typeof holder === 'object'
                ? (holder as Record<string, Json>)[step]
                : undefined
          if (holder === null || typeof holder !== 'object') continue
          const map = holder as Record<string, Json>
          if (what === 'put') map[at.at(-1)!] = structuredClone(item)
          else if (what === 'add' && !Array.isArray(holder)) map.extra = structuredClone(item)
          else if (what === 'leave-out' && !Array.isArray(holder)) delete map[at.at(-1)!]
        }
        const faults = faultsOf(settingsSchema, value)
        expect(faults.length === 0).toBe(settingsSchema.safeParse(value).success)
      }),
      { seed: 20261102, numRuns: 3000 },
    )
  })
})

describe('what the settings let pass, the rooms behind them take', () => {
  it('explicit limits name the statistics of the decision', () => {
    for (const name of limitNames) expect(errorCatalogue['limit-unknown'].remedy).toContain(name)
  })

  it('days of the week', () => {
    const word = fc.constantFrom('mon', 'Tue', 'wed', 'sun', 'sat', 'fry', '', ' thu')
    const part = fc.array(word, { minLength: 1, maxLength: 3 }).map((words) => words.join('-'))
    const days = fc.array(part, { minLength: 1, maxLength: 3 }).map((parts) => parts.join(','))
    fc.assert(
      fc.property(days, (written) => {
        const numbers = parseDays(written)
        if (numbers === null) return
        const sessions = new Sessions({
          zone: 'UTC',
          open: '09:00',
          close: '10:00',
          days: written,
          holidays: [],
        })
        // 1 November 2026 is a Sunday.
        for (let day = 0; day < 7; day++)
          expect(sessions.at(Date.UTC(2026, 10, 1 + day, 9, 30)) >= 0).toBe(numbers.includes(day))
      }),
      { seed: 5, numRuns: 500 },
    )
  })

  it('the pattern of the shipped plant matches exactly the transmitters of the demo feed', () => {
    const read = readSettings(fileURLToPath(new URL('../../config/plant.yaml', import.meta.url)), {})
    const signals = read.ok ? read.value.settings.ensembles.station!.signals : []
    const { pattern, limit } = signals as { pattern: string; limit: number }
    expect(stationSignals.filter((name) => matchesGlob(pattern, name))).toEqual(stationSignals)
    expect(limit).toBe(stationSignals.length)
    expect(deskSignals.filter((name) => matchesGlob(pattern, name))).toEqual([])
  })

  it('the shipped desk names exactly the instruments of the demo feed', () => {
    const env = { HOOK_SECRET: 'a secret of more than 24 characters' }
    const read = readSettings(fileURLToPath(new URL('../../config/desk.yaml', import.meta.url)), env)
    expect(read.ok && read.value.settings.ensembles.desk!.signals).toEqual(deskSignals)
  })
})
