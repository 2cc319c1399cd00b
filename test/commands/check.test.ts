import { mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterAll, beforeAll, beforeEach, describe, expect, it } from 'vitest'
import { type CheckParts, check } from '../../src/commands/check.ts'
import { failed, ok, TautlineError } from '../../src/errors.ts'
import { openStore } from '../../src/store/open-store.ts'
import { runLine } from './surroundings.ts'

let folder: string
beforeAll(() => {
  folder = mkdtempSync(join(tmpdir(), 'tautline-check-'))
})
afterAll(() => rmSync(folder, { recursive: true }))

const file = (name: string, text: string) => {
  const path = join(folder, name)
  writeFileSync(path, text)
  return path
}

const base = (
  more = '',
) => `ensembles: { desk: { signals: [A, B], clock: { step: 5s }, window: { frames: 20 } } }
feeds: { ticks: { file: { path: a.ndjson } } }
routes: { hook: { webhook: { url: "https://hooks.example/", secret: "\${HOOK}" }, timeout: 200ms } }
heartbeat: {}
${more}`

let sent: string[]
beforeEach(() => {
  sent = []
})

/** Ways in and out that answer as told. */
const parts = (answers: { feed?: string; route?: 'refused' | 'silent' | 'throws' } = {}): CheckParts => ({
  openFeed: (name) =>
    ok({ check: async () => ({ ok: answers.feed === undefined, detail: answers.feed ?? `${name} found` }) }),
  openRoute: (name) =>
    ok({
      check: async () => {
        if (answers.route === 'throws') throw new Error('broken with hunter22hunter22hunter22')
        if (answers.route === 'silent') return new Promise(() => {})
        return answers.route === 'refused'
          ? { ok: false, detail: 'answered 401', routeWide: true, retryAfterMs: null }
          : { ok: true, detail: 'answered 200' }
      },
      trial: async (now) => {
        sent.push(`${name} ${now}`)
        return { ok: true, detail: 'trial taken' }
      },
      close: async () => {},
    }),
})

const runCheck = (text: string, checkParts: CheckParts, ...args: string[]) =>
  runLine(['check', '--settings', file('desk.yaml', text), ...args], {
    env: { HOOK: 'hunter22hunter22hunter22' },
    commands: { check: (options) => check(options, checkParts) },
  })

describe('check', () => {
  it('tries settings, store, feeds and routes, prints one line for each and ends with 0', async () => {
    const ran = await runCheck(base(), parts())
    expect(ran.status).toBe(0)
    expect(
      ran.stdout.split('\n').map((line) =>
        line
          .split(/\s{2,}/)
          .slice(0, 2)
          .join(' '),
      ),
    ).toEqual(['ok settings', 'ok store', 'ok feed', 'ok route', 'All 4 in order.', ''])
    expect(sent).toEqual([])
  })

  it('sends a trial through every route only when asked', async () => {
    const ran = await runCheck(base(), parts(), '--trial-alert')
    expect(ran.status).toBe(0)
    expect(sent).toEqual([`hook ${Date.UTC(2026, 10, 2)}`])
    expect(ran.stdout).toContain('trial taken')
  })

  it.each([
    ['a feed that cannot be read', parts({ feed: 'no such file' }), 'FAILED  feed', 'no such file'],
    ['a route that refuses', parts({ route: 'refused' }), 'FAILED  route', 'answered 401'],
    ['a route that does not answer', parts({ route: 'silent' }), 'FAILED  route', 'no answer within 1.2 s'],
    ['a route that breaks', parts({ route: 'throws' }), 'FAILED  route', 'broken with [hidden]'],
    [
      'a route that cannot be made',
      { ...parts(), openRoute: () => failed(new TautlineError('route-secret', 'hook')) },
      'FAILED  route',
      'The secret of the webhook',
    ],
  ] as const)(
    '%s fails by itself, the others are tried all the same',
    async (_, checkParts, start, words) => {
      const ran = await runCheck(base(), checkParts)
      expect(ran.status).toBe(1)
      const line = ran.stdout.split('\n').find((one) => one.startsWith(start))
      expect(line).toContain(words)
      expect(ran.stdout).toContain('1 of 4 failed.')
      expect(ran.stdout).not.toContain('hunter22')
    },
  )

  it('writes records with --json', async () => {
    const ran = await runCheck(base(), parts({ feed: 'gone' }), '--json')
    const records = ran.stdout
      .trim()
      .split('\n')
      .map((line) => JSON.parse(line))
    expect(records.map(({ type, what, ok: fine }) => [type, what, fine])).toEqual([
      ['check', 'settings', true],
      ['check', 'store', true],
      ['check', 'feed', false],
      ['check', 'route', true],
      ['summary', undefined, undefined],
    ])
    expect(records.at(-1)).toEqual({ type: 'summary', tried: 4, failed: 1, warnings: 0 })
  })

  it('shows warnings without failing', async () => {
    const ran = await runCheck(base().replace('heartbeat: {}', ''), parts())
    expect(ran.status).toBe(0)
    expect(ran.stderr).toContain('Warning: No heartbeat is set')
    expect(ran.stdout).toContain('read, 1 warning')
  })

  it.each([
    ['names, one a line', 'A\nB\n\nC\n', true, '3 signals'],
    ['one name', 'A\n', false, 'fewer than two'],
    ['a name twice', 'A\nB\nA\n', false, 'names A twice'],
  ])('looks into a file of signals: %s', async (_, text, fine, words) => {
    file('names.txt', text)
    const ran = await runCheck(base().replace('[A, B]', '{ file: names.txt }'), parts())
    expect(ran.status).toBe(fine ? 0 : 1)
    expect(ran.stdout.split('\n').find((line) => line.includes('names.txt'))).toContain(words)
  })

  it.each([
    [
      'that is right',
      JSON.stringify({
        type: 'reference',
        names: ['A', 'B'],
        frames: 99,
        matrix: [
          [1, 0.5],
          [0.5, 1],
        ],
      }),
      true,
      '2 signals over 99 frames',
    ],
    ['that is no JSON', '{', false, 'is no JSON'],
    [
      'whose matrix is no correlation',
      JSON.stringify({
        names: ['A', 'B'],
        frames: 99,
        matrix: [
          [2, 0],
          [0, 1],
        ],
      }),
      false,
      'diagonal',
    ],
  ])('looks into a reference %s', async (_, text, fine, words) => {
    file('reference.json', text)
    const ran = await runCheck(
      base().replace('window: { frames: 20 }', 'window: { frames: 20 }, reference: { from: reference.json }'),
      parts(),
    )
    expect(ran.status).toBe(fine ? 0 : 1)
    expect(ran.stdout.split('\n').find((line) => line.includes('reference.json'))).toContain(words)
  })

  it('tells a store of another program, and leaves a store that is not there alone', async () => {
    file('other.db', 'something else entirely')
    const foreign = await runCheck(base('store: { path: other.db }'), parts())
    expect(foreign.stdout).toMatch(/FAILED\s+store .*no store of this monitor/)
    openStore(join(folder, 'mine.db')).close()
    expect((await runCheck(base('store: { path: mine.db }'), parts())).stdout).toMatch(
      /ok\s+store .*earlier run/,
    )
  })
})
