import { describe, expect, it } from 'vitest'
import { Access, isLoopbackHost } from '../../src/page/access.ts'

const token = 'a token of some length'.replaceAll(' ', '-')
const now = Date.UTC(2026, 10, 2)
const nobody = { authorization: undefined, cookie: undefined }

describe('who may look', () => {
  it('everybody on this machine while there is no token', () => {
    expect(new Access({ token: null, url: null }).mayLook(nobody, now)).toBe(true)
  })

  it('with a token, those who bring it', () => {
    const access = new Access({ token, url: null })
    expect(access.mayLook(nobody, now)).toBe(false)
    expect(access.mayLook({ ...nobody, authorization: `Bearer ${token}` }, now)).toBe(true)
    expect(access.mayLook({ ...nobody, authorization: `bearer ${token}` }, now)).toBe(true)
    for (const wrong of [`Bearer ${token}x`, `Bearer ${token.slice(1)}`, 'Bearer ', `Basic ${token}`, token])
      expect(access.mayLook({ ...nobody, authorization: wrong }, now)).toBe(false)
  })

  it('those whom a login gave a cookie, for a week', () => {
    const access = new Access({ token, url: null })
    const answer = access.login(token, now)
    const cookie = typeof answer === 'string' ? '' : answer.cookie
    expect(cookie).toMatch(/; HttpOnly; SameSite=Strict; Max-Age=604800$/)
    expect(cookie).not.toContain(token)
    const [pair = ''] = cookie.split(';')
    expect(access.mayLook({ ...nobody, cookie: `other=1; ${pair}; more=2` }, now + 6 * 86_400_000)).toBe(true)
    expect(access.mayLook({ ...nobody, cookie: pair }, now + 7 * 86_400_000)).toBe(false)
  })

  it('nobody whose cookie was changed, or made for another token', () => {
    const access = new Access({ token, url: null })
    const answer = new Access({ token: 'another token', url: null }).login('another token', now)
    const other = typeof answer === 'string' ? '' : answer.cookie.split(';')[0]!
    const own = access.login(token, now) as { cookie: string }
    const longer = own.cookie.split(';')[0]!.replace(/=(\d)/, '=9$1')
    expect(other).toMatch(/^tautline-page=\d+\.[0-9a-f]{64}$/)
    expect(access.mayLook({ ...nobody, cookie: other }, now)).toBe(false)
    expect(access.mayLook({ ...nobody, cookie: longer }, now)).toBe(false)
  })

  it('asks for encryption of the cookie where the page is reached by https', () => {
    const answer = new Access({ token, url: 'https://monitor.example/' }).login(token, now)
    expect(answer).toMatchObject({ cookie: expect.stringMatching(/; Secure$/) })
  })

  it('hears no more tokens after twenty wrong ones within a minute', () => {
    const access = new Access({ token, url: null })
    for (let k = 0; k < 20; k++) expect(access.login('wrong', now + k)).toBe('wrong')
    expect(access.login(token, now + 100)).toBe('too-often')
    expect(access.login(token, now + 60_100)).toHaveProperty('cookie')
  })
})

describe('the name under which it is asked', () => {
  const open = new Access({ token: null, url: 'http://desk.example:9000/' })

  it.each([
    '127.0.0.1:8450',
    '127.0.0.1',
    'localhost:8450',
    'LOCALHOST',
    '[::1]:8450',
    'desk.example',
    'desk.example:1',
  ])('takes %s without a token', (host) => {
    expect(open.isKnownHost({ host })).toBe(true)
  })

  it.each([
    'evil.example:8450',
    'localhost.evil.example',
    '127.0.0.1.evil.example',
    'evil.example@127.0.0.1',
    '10.0.0.1',
    '[::2]',
    '',
    undefined,
  ])('refuses %s without a token', (host) => {
    expect(open.isKnownHost({ host })).toBe(false)
  })

  it('takes any with a token, since a cookie belongs to a name', () => {
    expect(new Access({ token, url: null }).isKnownHost({ host: 'anything.example' })).toBe(true)
  })

  it('is this machine for 127.0.0.0/8, ::1 and localhost alone', () => {
    for (const host of ['localhost', '127.0.0.1', '127.9.9.9', '::1', '[::1]', 'localhost.'])
      expect(isLoopbackHost(host)).toBe(true)
    for (const host of ['0.0.0.0', '::', '128.0.0.1', 'localhost.example', '127.0.0.1.example'])
      expect(isLoopbackHost(host)).toBe(false)
  })
})

describe('another site', () => {
  const access = new Access({ token: null, url: null })
  it('may lead here but not fetch from here', () => {
    expect(access.isForeign({ fetchSite: 'cross-site', fetchMode: 'cors' })).toBe(true)
    expect(access.isForeign({ fetchSite: 'same-site', fetchMode: 'no-cors' })).toBe(true)
    expect(access.isForeign({ fetchSite: 'cross-site', fetchMode: 'navigate' })).toBe(false)
    expect(access.isForeign({ fetchSite: 'same-origin', fetchMode: 'cors' })).toBe(false)
    expect(access.isForeign({ fetchSite: undefined, fetchMode: undefined })).toBe(false)
  })
})
