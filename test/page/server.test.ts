import { mkdtemp, rm, writeFile } from 'node:fs/promises'
import { createServer, request } from 'node:http'
import { type AddressInfo, connect } from 'node:net'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { pathToFileURL } from 'node:url'
import { afterAll, afterEach, beforeAll, describe, expect, it } from 'vitest'
import { TautlineError } from '../../src/errors.ts'
import { type PageOptions, pageApp, pageServer } from '../../src/page/server.ts'
import type { PageView } from '../../src/page/view.ts'
import { raisedAndEnded } from '../alerts/support/shifts.ts'
import { emptyState, fullState, judged, lastFrame, timeOf } from './support/invented.ts'

const token = 'a-token-of-some-length'
const now = timeOf(lastFrame)

let folder: string
beforeAll(async () => {
  folder = await mkdtemp(join(tmpdir(), 'tautline-page-'))
  await writeFile(join(folder, 'app.js'), 'export {}\n//# sourceMappingURL=app.js.map\n')
  await writeFile(join(folder, 'app.d.ts'), 'export {}')
})
afterAll(() => rm(folder, { recursive: true }))

const ending: (() => Promise<unknown>)[] = []
afterEach(async () => {
  for (const end of ending.splice(0)) await end()
})

const options = (over: Partial<PageOptions> = {}): PageOptions => ({
  listen: '127.0.0.1:0',
  state: fullState(),
  metrics: async () => ({
    contentType: 'text/plain; version=0.0.4; charset=utf-8',
    body: 'tautline_escapes 1\n',
  }),
  live: () => ({ ok: true, body: { ok: true, reasons: [] } }),
  ready: () => ({ ok: false, body: { ok: false, reasons: ['feed station is not connected'] } }),
  quarantine: () => [{ feed: 'ticks', reason: 'unreadable' }],
  alert: (id) => (id === 'desk/3/2026-11-02T10:08:25Z' ? { id } : null),
  regimes: (ensemble) => [{ kind: 'shift', ensemble }],
  now: () => now,
  clientFolder: pathToFileURL(`${folder}/`),
  ...over,
})

async function app(over: Partial<PageOptions> = {}) {
  const server = await pageApp(options(over))
  ending.push(() => server.close())
  return (url: string, headers: Record<string, string> = {}) =>
    server.inject({ url, headers: { host: '127.0.0.1:8450', ...headers } })
}

async function served(over: Partial<PageOptions> = {}) {
  const page = await pageServer(options(over))
  ending.push(() => page.close())
  return page
}

describe('the routes of the page', () => {
  it('serve the page without a script or style of its own and without anything from elsewhere', async () => {
    const get = await app()
    const answer = await get('/')
    expect(answer.statusCode).toBe(200)
    expect(answer.headers['content-type']).toBe('text/html; charset=utf-8')
    expect(answer.headers['content-security-policy']).toMatch(
      /^default-src 'none'; script-src 'self'; style-src 'self';/,
    )
    expect(answer.headers['content-security-policy']).not.toContain('unsafe')
    expect(answer.body).not.toMatch(/style=|<style|\son[a-z]+=|https?:\/\//)
    for (const script of answer.body.match(/<script[\s\S]*?<\/script>/g) ?? [])
      expect(script).toMatch(/^<script type="module" src="\/assets\/[a-z]+\.js"><\/script>$/)
  })

  it('serve each asset that the page names, with its type and a tag', async () => {
    const get = await app()
    const types: Record<string, string> = {
      'app.js': 'text/javascript; charset=utf-8',
      'style.css': 'text/css; charset=utf-8',
      'mark.svg': 'image/svg+xml',
    }
    const page = (await get('/')).body
    for (const [name, type] of Object.entries(types)) {
      expect(page).toContain(`/assets/${name}`)
      const answer = await get(`/assets/${name}`)
      expect([answer.statusCode, answer.headers['content-type']]).toEqual([200, type])
      expect(answer.body).not.toContain('sourceMappingURL')
      const again = await get(`/assets/${name}`, { 'if-none-match': String(answer.headers.etag) })
      expect([again.statusCode, again.body]).toEqual([304, ''])
    }
  })

  it.each(['/assets/app.d.ts', '/assets/..%2fserver.ts', '/assets/', '/nothing', '/alerts/desk/9/none'])(
    'give 404 for %s, and say no more than that',
    async (path) => {
      const answer = await (await app())(path)
      expect(answer.statusCode).toBe(404)
      expect(answer.json()).toEqual({ ok: false, sentence: 'There is nothing here.' })
    },
  )

  it('serve the state as JSON', async () => {
    const view = (await (await app())('/state')).json() as PageView
    expect(view).toEqual(JSON.parse(JSON.stringify(fullState().view(now))))
  })

  it('serve metrics, quarantine, one alert and the journal of an ensemble', async () => {
    const get = await app()
    const metrics = await get('/metrics')
    expect([metrics.headers['content-type'], metrics.body]).toEqual([
      'text/plain; version=0.0.4; charset=utf-8',
      'tautline_escapes 1\n',
    ])
    expect((await get('/quarantine')).json()).toEqual({ records: [{ feed: 'ticks', reason: 'unreadable' }] })
    expect((await get('/alerts/desk/3/2026-11-02T10:08:25Z')).json()).toEqual({
      id: 'desk/3/2026-11-02T10:08:25Z',
    })
    expect((await get('/alerts/desk%2F3%2F2026-11-02T10%3A08%3A25Z')).json()).toEqual({
      id: 'desk/3/2026-11-02T10:08:25Z',
    })
    expect((await get('/regimes/desk')).json()).toEqual({ entries: [{ kind: 'shift', ensemble: 'desk' }] })
  })

  it('answer 200 or 503 for health, with the reasons', async () => {
    const get = await app()
    expect((await get('/health/live')).statusCode).toBe(200)
    const ready = await get('/health/ready')
    expect([ready.statusCode, ready.json()]).toEqual([
      503,
      { ok: false, reasons: ['feed station is not connected'] },
    ])
  })

  it('never show a stack or a message of a defect', async () => {
    const get = await app({
      quarantine: () => {
        throw new Error('secret inner words')
      },
    })
    const answer = await get('/quarantine')
    expect([answer.statusCode, answer.json()]).toEqual([
      500,
      { ok: false, sentence: 'The monitor could not answer.' },
    ])
  })
})

describe('without a token', () => {
  it('answers no name that is not this machine, on no route', async () => {
    const get = await app()
    for (const path of ['/', '/state', '/events', '/metrics', '/health/live', '/assets/app.js'])
      expect((await get(path, { host: 'evil.example:8450' })).statusCode).toBe(421)
  })

  it('answers no fetch of another site', async () => {
    const get = await app()
    expect(
      (await get('/state', { 'sec-fetch-site': 'cross-site', 'sec-fetch-mode': 'no-cors' })).statusCode,
    ).toBe(403)
  })

  it.each(['0.0.0.0:0', '[::]:0', '192.0.2.1:0'])('refuses to listen on %s', async (listen) => {
    await expect(pageServer(options({ listen }))).rejects.toMatchObject({ code: 'settings-exposed' })
  })
})

describe('with a token', () => {
  it('shows nothing of the state without it', async () => {
    const get = await app({ token })
    for (const path of [
      '/state',
      '/events',
      '/metrics',
      '/quarantine',
      '/alerts/desk/3/x',
      '/regimes/desk',
      '/nothing',
    ]) {
      const answer = await get(path)
      expect([path, answer.statusCode, answer.headers['www-authenticate']]).toEqual([
        path,
        401,
        'Bearer realm="tautline"',
      ])
    }
    const page = await get('/')
    expect([page.statusCode, page.body.includes('type="password"'), page.body.includes('Northern')]).toEqual([
      401,
      true,
      false,
    ])
    expect((await get('/health/ready')).json()).toEqual({ ok: false })
    expect((await get('/health/live')).statusCode).toBe(200)
  })

  it('shows all of it to a scraper that brings it', async () => {
    const get = await app({ token })
    const headers = { authorization: `Bearer ${token}` }
    expect((await get('/metrics', headers)).statusCode).toBe(200)
    expect((await get('/health/ready', headers)).json().reasons.length).toBe(1)
  })

  it('lets a browser in by its form, from then on by a cookie', async () => {
    const server = await pageApp(options({ token }))
    ending.push(() => server.close())
    const login = (body: string) =>
      server.inject({
        method: 'POST',
        url: '/login',
        headers: { host: 'monitor.example', 'content-type': 'application/x-www-form-urlencoded' },
        body,
      })
    const wrong = await login('token=wrong')
    expect([wrong.statusCode, wrong.headers['set-cookie']]).toEqual([401, undefined])
    const right = await login(`token=${encodeURIComponent(token)}`)
    expect([right.statusCode, right.headers.location]).toEqual([303, '/'])
    const cookie = String(right.headers['set-cookie']).split(';')[0]!
    const state = await server.inject({ url: '/state', headers: { host: 'monitor.example', cookie } })
    expect(state.statusCode).toBe(200)
    expect((await login('x'.repeat(10_000))).statusCode).toBe(413)
  })

  it('leads a login to the ensemble that the link named, and nowhere else', async () => {
    const server = await pageApp(options({ token }))
    ending.push(() => server.close())
    const ask = (method: 'GET' | 'POST', url: string, given = '') =>
      server.inject({
        method,
        url,
        headers: { host: 'monitor.example', 'content-type': 'application/x-www-form-urlencoded' },
        ...(given === '' ? {} : { body: `token=${encodeURIComponent(given)}` }),
      })
    const evil = '?ensemble=%22%3E%3Cb%3E%2F%2Fevil.example&next=//evil.example'
    const kept = '?ensemble=%22%3E%3Cb%3E%2F%2Fevil.example'
    const form = `action="/login${kept}"`
    expect((await ask('GET', `/${evil}`)).body).toContain(form)
    expect((await ask('POST', `/login${evil}`, 'wrong')).body).toContain(form)
    expect((await ask('POST', `/login${evil}`, token)).headers.location).toBe(`/${kept}`)
    expect((await ask('GET', `/login${evil}`)).headers.location).toBe(`/${kept}`)
    expect((await ask('POST', '/login?ensemble=a&ensemble=b', token)).headers.location).toBe('/')
    expect((await ask('GET', '/login?ensemble=%ED%A0%80')).statusCode).toBe(303)
  })

  it('may listen anywhere', async () => {
    const page = await served({ token, listen: '0.0.0.0:0' })
    expect(page.url).toMatch(/^http:\/\/0\.0\.0\.0:\d+\/$/)
  })
})

describe('the running server', () => {
  it('streams the state, then what changes, and resumes behind the last id', async () => {
    const state = fullState()
    const page = await served({ state, now: Date.now })
    const first = await eventsFrom(page.url, {}, (events) => {
      if (events.length === 1) state.judged(judged(lastFrame + 1))
      return events.some(({ event }) => event === 'change')
    })
    expect(first[0]?.event).toBe('state')
    state.judged(judged(lastFrame + 2))
    const second = await eventsFrom(
      page.url,
      { 'last-event-id': first.at(-1)!.id },
      (events) => events.length === 1,
    )
    expect(second[0]).toMatchObject({
      event: 'change',
      data: { ensembles: [{ present: { frame: lastFrame + 2 } }] },
    })
  })

  it('lets go of a reader that takes nothing from its socket, while another reads on', async () => {
    const state = emptyState()
    const [alert] = raisedAndEnded()
    const page = await served({ state, now: Date.now })
    const { port } = new URL(page.url)
    const slow = connect(Number(port), '127.0.0.1')
    ending.push(async () => slow.destroy())
    const letGo = new Promise((resolve) => slow.on('close', resolve).on('error', () => {}))
    await new Promise<void>((resolve) => {
      slow.write('GET /events HTTP/1.1\r\nHost: localhost\r\n\r\n')
      slow.once('data', () => {
        slow.pause()
        resolve()
      })
    })
    const answer = await fetch(`${page.url}events`)
    let version = alert.version
    const growing = setInterval(
      () => state.alert({ ...alert, version: ++version, details: ['x'.repeat(1_500_000)] }),
      20,
    )
    ending.push(async () => clearInterval(growing))
    // More than the kernel holds for both ends of a socket.
    const enough = 24_000_000
    let read = 0
    for await (const chunk of answer.body!) {
      read += chunk.length
      if (read >= enough) break
    }
    expect(read).toBeGreaterThanOrEqual(enough)
    slow.resume()
    await letGo
  })

  it('closes at once although a stream is open', async () => {
    const page = await pageServer(options())
    await eventsFrom(page.url, {}, (events) => events.length === 1, { keepOpen: true })
    await page.close()
    await expect(fetch(page.url)).rejects.toThrow()
  })

  it('says which address cannot be had, with a remedy', async () => {
    const taken = createServer()
    await new Promise<void>((resolve) => taken.listen(0, '127.0.0.1', resolve))
    ending.push(() => new Promise((resolve) => taken.close(resolve)))
    const listen = `127.0.0.1:${(taken.address() as AddressInfo).port}`
    const error = await pageServer(options({ listen })).catch((caught) => caught)
    expect(error).toBeInstanceOf(TautlineError)
    expect([error.code, error.detail]).toEqual(['page-unopened', `${listen}: EADDRINUSE.`])
  })

  it('says so when its browser part was not built', async () => {
    const clientFolder = pathToFileURL(`${folder}/none/`)
    await expect(pageServer(options({ clientFolder }))).rejects.toMatchObject({ code: 'page-unbuilt' })
  })

  it('outlives rubbish on its socket', async () => {
    const page = await served()
    const { port } = new URL(page.url)
    for (const rubbish of [
      '\0\0\0\0',
      'GET / HTTP/9.9\r\n\r\n',
      'GET /%zz HTTP/1.1\r\nHost: 127.0.0.1\r\n\r\n',
    ])
      await new Promise<void>((resolve) => {
        const socket = connect(Number(port), '127.0.0.1', () => socket.end(rubbish))
        socket.on('close', () => resolve())
        socket.on('error', () => resolve())
        socket.resume()
      })
    expect((await fetch(`${page.url}state`)).status).toBe(200)
  })
})

interface Heard {
  readonly id: string
  readonly event: string
  readonly data: unknown
}

/** Reads events until `enough` says so. */
function eventsFrom(
  url: string,
  headers: Record<string, string>,
  enough: (events: readonly Heard[]) => boolean,
  { keepOpen = false } = {},
): Promise<readonly Heard[]> {
  return new Promise((resolve, reject) => {
    const asked = request(`${url}events`, { headers }, (response) => {
      let text = ''
      let seen = 0
      response.on('data', (chunk: Buffer) => {
        text += chunk
        const blocks = text.split('\n\n').slice(0, -1)
        const events = blocks.flatMap((block) => {
          const [, event] = /^event: (.*)$/m.exec(block) ?? []
          if (event === undefined || event === 'beat') return []
          return [
            { id: /^id: (.*)$/m.exec(block)![1]!, event, data: JSON.parse(/^data: (.*)$/m.exec(block)![1]!) },
          ]
        })
        if (events.length === seen) return
        seen = events.length
        if (!enough(events)) return
        resolve(events)
        if (!keepOpen) asked.destroy()
      })
      response.on('error', () => {})
    })
    asked.on('error', reject)
    asked.end()
  })
}
