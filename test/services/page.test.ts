import { rm } from 'node:fs/promises'
import { connect, createServer, type Socket } from 'node:net'
import type { Browser, BrowserContextOptions, Page } from 'playwright-core'
import { afterAll, afterEach, beforeAll, describe, expect, inject, it } from 'vitest'
import { cautions } from '../../src/alerts/wording.ts'
import type { PageState } from '../../src/page/page-state.ts'
import { type PageOptions, type PageServer, pageServer } from '../../src/page/server.ts'
import { builtClient } from '../page/support/built-client.ts'
import { emptyState, fullState, judged, lastFrame, learningFrame, shiftAt } from '../page/support/invented.ts'
import { freePort } from '../support/host.ts'
import { openBrowser } from './support/browser.ts'

let browser: Browser
let client: Awaited<ReturnType<typeof builtClient>>
beforeAll(async () => {
  ;[browser, client] = await Promise.all([openBrowser(inject('chromium')), builtClient()])
})
afterAll(async () => {
  await browser?.close()
  await rm(client.scratch, { recursive: true })
})

const ending: (() => Promise<unknown>)[] = []
afterEach(async () => {
  for (const end of ending.splice(0).reverse()) await end()
})

async function serve(state: PageState, over: Partial<PageOptions> = {}): Promise<PageServer> {
  const page = await pageServer({
    listen: '127.0.0.1:0',
    state,
    metrics: async () => ({ contentType: 'text/plain', body: '' }),
    live: () => ({ ok: true, body: {} }),
    ready: () => ({ ok: true, body: {} }),
    quarantine: () => [],
    alert: () => null,
    now: Date.now,
    clientFolder: client.folder,
    ...over,
  })
  ending.push(() => page.close())
  return page
}

/** A tab, with everything that its console and its network complained of or asked for. */
async function open(url: string, context: BrowserContextOptions = {}) {
  const held = await browser.newContext({ viewport: { width: 1280, height: 900 }, ...context })
  ending.push(() => held.close())
  const tab = await held.newPage()
  const complaints: string[] = []
  const asked: string[] = []
  tab.on('pageerror', (error) => complaints.push(error.message))
  tab.on('console', (message) => {
    if (message.type() === 'error' || message.type() === 'warning') complaints.push(message.text())
  })
  tab.on('request', (request) => asked.push(request.url()))
  await tab.goto(url)
  return { tab, complaints, asked }
}

const textOf = async (tab: Page, selector: string): Promise<string> =>
  ((await tab.locator(selector).textContent()) ?? '').replaceAll(/\s+/g, ' ')
const says = (tab: Page, text: string | RegExp, timeout = 10_000) =>
  tab.getByText(text).first().waitFor({ timeout })

describe('the page in a browser', () => {
  it('says in text the state, since when, the reason, the carriers and the cautions, worst first', async () => {
    const { url } = await serve(fullState())
    const { tab, complaints, asked } = await open(url)
    await says(tab, 'Shift 3, confirmed')
    expect(await tab.locator('.overview li .head').allTextContents()).toEqual([
      expect.stringMatching(/Northern desk shifted since 10:11:45 UTC, for 3 min 20 s/),
      expect.stringMatching(/Tank yard learning since 09:00:05 UTC/),
      expect.stringMatching(/Pumping station steady since 09:20:05 UTC/),
    ])
    const desk = await textOf(tab, '#ensemble-desk')
    expect(desk).toContain(
      'Why shifted: Shift 3 (strength): leading-share is at 128 % of its limit for 15 frames',
    )
    expect(desk).toMatch(/Who carries shift 3 ?QUAY ?16 % ?MAST ?8\.0 %/)
    expect(desk).toMatch(/WINCH ?1\.6 % ?the rest ?58 %/)
    expect(await textOf(tab, '#ensemble-station')).toContain('left out: PT-103 (constant)')
    expect(await textOf(tab, '#alerts')).toMatch(
      /unacknowledged Northern desk: the same signals have moved together/,
    )
    expect(await textOf(tab, 'footer')).toContain(cautions.join(''))
    expect(await textOf(tab, 'main')).toContain(
      'ticks: connected; 182,344 readings, dropped: 12 late, 1 unreadable.',
    )
    expect(await tab.title()).toBe('1 shifted, 1 learning, 1 steady, 1 feed is not connected · Tautline')
    expect(complaints).toEqual([])
    expect(asked.filter((one) => !one.startsWith(url))).toEqual([])
  })

  it('draws each strip, and says to those who do not see it what it shows', async () => {
    const { url } = await serve(fullState())
    const { tab } = await open(url)
    await says(tab, 'Shift 3, confirmed')
    const labels = await tab
      .locator('#ensemble-desk .strips svg')
      .evaluateAll((all) => all.map((one) => one.getAttribute('aria-label')))
    expect(labels).toEqual([
      expect.stringMatching(/^share of the leading mode \d+ %$/),
      expect.stringMatching(/^largest eigenvalue [\d.]+, second [\d.]+, edge of the noise 2\.43$/),
      expect.stringMatching(/^\d escapes$/),
      expect.stringMatching(/^distance 1\.31 under a ceiling of 1\.54$/),
      'evidence at 181 % of its limit',
    ])
    const drawn = await tab
      .locator('#ensemble-desk .strips path.main')
      .evaluateAll((all) => all.map((one) => (one as SVGPathElement).getBBox().width))
    for (const width of drawn) expect(width).toBeGreaterThan(300)
    expect(drawn.length).toBe(5)
    expect(await tab.locator('#ensemble-yard .strips').isVisible()).toBe(false)
  })

  it('follows what happens without a reload, and leaves what the reader has opened open', async () => {
    const state = emptyState()
    state.judged(learningFrame(62))
    const { url } = await serve(state)
    const { tab } = await open(url)
    await says(tab, 'Learns what is usual: 63 of 200 frames.')
    await tab.locator('#ensemble-desk summary').click()
    await tab.evaluate(() => Object.assign(window, { untouched: true }))
    state.judged(judged(700, { verdict: { state: 'shifted', shift: shiftAt(700, { kind: 'partners' }) } }))
    await says(tab, 'other signals move together than before')
    expect(await tab.locator('#ensemble-desk details').getAttribute('open')).toBe('')
    expect(await tab.evaluate(() => 'untouched' in window)).toBe(true)
  })

  it('shows text from outside as text', async () => {
    const state = emptyState()
    const evil = '<img src=x onerror="document.title=1">'
    state.judged(judged(1, { verdict: { leaders: [{ signal: evil, share: 0.5 }] } }))
    state.finding('desk', {
      signal: evil,
      finding: 'stuck',
      from: 0,
      to: null,
      detail: '</li><script>1</script>',
    })
    const { url } = await serve(state)
    const { tab, complaints } = await open(url)
    await says(tab, evil)
    expect(await tab.locator('img, main script').count()).toBe(0)
    expect(complaints).toEqual([])
  })

  it('leads the link of an alert to its ensemble', async () => {
    const { url } = await serve(fullState())
    const { tab } = await open(`${url}?ensemble=station`)
    // Its head comes to lie under the top margin, or as far up as the end of the page allows.
    const below = () =>
      tab.evaluate(() => {
        const top = document.getElementById('ensemble-station')?.getBoundingClientRect().top ?? Number.NaN
        const left = document.documentElement.scrollHeight - innerHeight - scrollY
        return scrollY > 0 && (Math.abs(top - 64) < 2 || Math.abs(left) < 2)
      })
    await expect.poll(below, { timeout: 10_000 }).toBe(true)
  })
})

describe('a page that has lost the monitor', () => {
  const banner = /The connection to the monitor has been lost/

  it('says so within five seconds of its end, and is live again by itself when it is back', async () => {
    const listen = `127.0.0.1:${await freePort()}`
    const first = await serve(fullState(), { listen })
    const { tab } = await open(first.url)
    await says(tab, 'Shift 3, confirmed')
    expect(await tab.locator('.banner').isVisible()).toBe(false)
    await tab.evaluate(() => Object.assign(window, { untouched: true }))
    await first.close()
    await says(tab, banner, 5000)
    expect(await tab.title()).toBe('connection lost · Tautline')
    const state = emptyState()
    state.judged(learningFrame(63))
    await serve(state, { listen })
    await says(tab, 'Learns what is usual: 64 of 200 frames.')
    expect(await tab.locator('.banner').isVisible()).toBe(false)
    expect(await tab.locator('#alerts li').count()).toBe(0)
    expect(await tab.evaluate(() => 'untouched' in window)).toBe(true)
  })

  it('says so within five seconds of a connection falling silent without an end', async () => {
    const page = await serve(fullState())
    const wire = await silenceable(Number(new URL(page.url).port))
    const { tab } = await open(`http://127.0.0.1:${wire.port}/`)
    await says(tab, 'Shift 3, confirmed')
    wire.silent = true
    await says(tab, banner, 5500)
    wire.silent = false
    await tab.locator('.banner').waitFor({ state: 'hidden', timeout: 15_000 })
  })
})

describe('how the page looks', () => {
  const widths = [320, 390, 768, 1280, 2000]

  it.each(['light', 'dark'] as const)(
    'fits every width from 320 px on without scrolling sideways, %s',
    async (colorScheme) => {
      const { url } = await serve(fullState())
      const { tab } = await open(url, { colorScheme })
      await says(tab, 'Shift 3, confirmed')
      await tab.evaluate(() => {
        for (const details of document.querySelectorAll('details')) details.open = true
      })
      for (const width of widths) {
        await tab.setViewportSize({ width, height: 900 })
        expect([width, await tab.evaluate(() => document.documentElement.scrollWidth)]).toEqual([
          width,
          width,
        ])
      }
    },
  )

  it.each(['light', 'dark'] as const)(
    'is grey while all is steady, and coloured where it is not, %s',
    async (colorScheme) => {
      const state = emptyState({ ensembles: [{ name: 'desk', title: 'Northern desk' }], feeds: [] })
      for (let frame = 0; frame < 30; frame++) state.judged(judged(frame))
      const { url } = await serve(state)
      const { tab } = await open(url, { colorScheme })
      await says(tab, 'The signals move together as in the reference')
      expect(await mostChroma(tab)).toBeLessThan(16)
      state.judged(judged(31, { verdict: { state: 'straining' } }))
      await says(tab, 'Evidence for a change gathers')
      expect(await mostChroma(tab)).toBeGreaterThan(80)
    },
  )

  it('has contrast for every text of at least 4.5 to 1 (WCAG 2.2, 1.4.3), in both themes', async () => {
    const { url } = await serve(fullState())
    for (const colorScheme of ['light', 'dark'] as const) {
      const { tab } = await open(url, { colorScheme })
      await says(tab, 'Shift 3, confirmed')
      expect(await leastContrast(tab)).toBeGreaterThanOrEqual(4.5)
    }
  })

  it('tells the states apart by word and by form, not by colour alone', async () => {
    const state = emptyState({
      ensembles: ['a', 'b', 'c', 'd'].map((name) => ({ name, title: name })),
      feeds: [],
    })
    state.judged(learningFrame(1, { ensemble: 'a' }))
    state.judged(judged(1, { ensemble: 'b' }))
    state.judged(judged(1, { ensemble: 'c', verdict: { state: 'straining' } }))
    state.judged(judged(1, { ensemble: 'd', verdict: { state: 'shifted' } }))
    const { url } = await serve(state)
    const { tab } = await open(url)
    await says(tab, 'The regime has shifted.')
    expect(await tab.locator('.overview strong').allTextContents()).toEqual([
      'shifted',
      'straining',
      'learning',
      'steady',
    ])
    const forms = await tab
      .locator('.overview .shape path')
      .evaluateAll((all) => all.map((one) => one.getAttribute('d')))
    expect(new Set(forms).size).toBe(4)
  })
})

describe('a page with a token', () => {
  it('asks for it, remembers it in a cookie that no script can read, and then shows the state', async () => {
    const { url } = await serve(fullState(), { token: 'a-token-of-some-length' })
    const { tab, complaints } = await open(`${url}?ensemble=desk`)
    await tab.getByLabel('Token of this page').fill('wrong')
    await tab.getByRole('button').click()
    await says(tab, 'This is not the token.')
    await tab.getByLabel('Token of this page').fill('a-token-of-some-length')
    await tab.getByRole('button').click()
    await says(tab, 'Shift 3, confirmed')
    expect(tab.url()).toBe(`${url}?ensemble=desk`)
    expect(await tab.evaluate(() => document.cookie)).toBe('')
    const [cookie] = await tab.context().cookies()
    expect(cookie).toMatchObject({ httpOnly: true, sameSite: 'Strict', path: '/' })
    // Browsers report the 401 of the first visits themselves.
    expect(complaints.filter((one) => !one.includes('401'))).toEqual([])
  })

  it('lets one who has logged in follow a link from another site', async () => {
    const { url } = await serve(fullState(), { token: 'a-token-of-some-length' })
    const { tab } = await open(url)
    await tab.getByLabel('Token of this page').fill('a-token-of-some-length')
    await tab.getByRole('button').click()
    await says(tab, 'Shift 3, confirmed')
    // localhost and 127.0.0.1 are two sites for a browser.
    const elsewhere = await serve(emptyState())
    await tab.goto(elsewhere.url.replace('127.0.0.1', 'localhost'))
    await tab.evaluate((to) => location.assign(to), `${url}?ensemble=desk`)
    await says(tab, 'Shift 3, confirmed')
    expect(tab.url()).toBe(`${url}?ensemble=desk`)
  })
})

/** A wire to a port of this machine that can fall silent without being cut. */
async function silenceable(to: number): Promise<{ readonly port: number; silent: boolean }> {
  const sockets = new Set<Socket>()
  const wire = { port: 0, silent: false }
  const server = createServer((near) => {
    const far = connect(to, '127.0.0.1')
    for (const [from, into] of [
      [near, far],
      [far, near],
    ] as const) {
      sockets.add(from)
      from.on('data', (chunk) => {
        if (!wire.silent) into.write(chunk)
      })
      from.on('error', () => {})
      from.on('close', () => {
        sockets.delete(from)
        if (!wire.silent) into.destroy()
      })
    }
  })
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve))
  wire.port = (server.address() as { port: number }).port
  ending.push(async () => {
    for (const socket of sockets) socket.destroy()
    await new Promise((resolve) => server.close(resolve))
  })
  return wire
}

/** The largest difference between the channels (0 to 255) of a colour in use. */
const mostChroma = (tab: Page): Promise<number> =>
  tab.evaluate(() => {
    let most = 0
    for (const node of document.querySelectorAll('body, body *')) {
      const style = getComputedStyle(node)
      const colours = [style.color, style.backgroundColor, style.borderTopColor]
      if (node instanceof SVGPathElement) colours.push(style.stroke, style.fill)
      // Marks of a shift that does not stand have no form.
      if (node instanceof SVGPathElement && !node.getAttribute('d')) continue
      for (const colour of colours) {
        const [r = 0, g = 0, b = 0] = (colour.match(/[\d.]+/g) ?? []).map(Number)
        most = Math.max(most, Math.max(r, g, b) - Math.min(r, g, b))
      }
    }
    return most
  })

/** Least contrast ratio of a text in sight against the ground (WCAG 2.2, definitions of contrast and luminance). */
const leastContrast = (tab: Page): Promise<number> =>
  tab.evaluate(() => {
    const luminance = (colour: string): number => {
      const [r = 0, g = 0, b = 0] = (colour.match(/[\d.]+/g) ?? []).map((text) => {
        const c = Number(text) / 255
        return c <= 0.04045 ? c / 12.92 : ((c + 0.055) / 1.055) ** 2.4
      })
      return 0.2126 * r + 0.7152 * g + 0.0722 * b
    }
    const ground = luminance(getComputedStyle(document.documentElement).backgroundColor)
    let least = 21
    for (const node of document.querySelectorAll('body *')) {
      const own = [...node.childNodes].some((child) => child.nodeType === 3 && child.textContent?.trim())
      if (!own || !(node instanceof HTMLElement) || node.closest('[hidden], .banner, noscript')) continue
      const ink = luminance(getComputedStyle(node).color)
      least = Math.min(least, (Math.max(ink, ground) + 0.05) / (Math.min(ink, ground) + 0.05))
    }
    return least
  })

it('keeps no more than its bound of a long run in the browser', async () => {
  const state = emptyState({ history: { points: 50, coarsest: 2 } })
  const { url } = await serve(state)
  const { tab } = await open(url)
  for (let burst = 0; burst < 6; burst++) {
    for (let k = 0; k < 40; k++) state.judged(judged(40 * burst + k))
    await says(tab, new RegExp(`Last frame: number ${40 * burst + 39},`))
  }
  const path = (await tab.locator('#ensemble-desk .strips path.main').first().getAttribute('d')) ?? ''
  const corners = path.match(/[ML]/g)?.length ?? 0
  expect(corners).toBeGreaterThan(40)
  expect(corners).toBeLessThanOrEqual(51)
})

it('is told of the last frame of a run that has gone far', async () => {
  const state = fullState()
  const { url } = await serve(state)
  const { tab } = await open(url)
  state.judged(judged(lastFrame + 5000))
  await says(tab, 'Last frame: number 5,900,')
})
