import { createHash, createHmac, timingSafeEqual } from 'node:crypto'

const cookieName = 'tautline-page'
const stayMs = 7 * 86_400_000
const mostFailuresAMinute = 20

export interface AccessOptions {
  /** null: whoever reaches the server may look. */
  readonly token: string | null
  /** Address under which people reach the page; its host is taken besides those of loopback. */
  readonly url: string | null
}

/** The headers that decide. */
export interface Asker {
  readonly host: string | undefined
  readonly authorization: string | undefined
  readonly cookie: string | undefined
  /** `Sec-Fetch-Site` and `Sec-Fetch-Mode` (W3C Fetch Metadata). */
  readonly fetchSite: string | undefined
  readonly fetchMode: string | undefined
}

/** Who may look. Time is an argument, milliseconds since 1970 UTC. */
export class Access {
  readonly #token: string | null
  readonly #ownHost: string | null
  readonly #secure: boolean
  #failures: number[] = []

  constructor({ token, url }: AccessOptions) {
    this.#token = token
    this.#ownHost = url === null ? null : new URL(url).hostname.toLowerCase()
    this.#secure = url?.startsWith('https:') ?? false
  }

  get needsToken(): boolean {
    return this.#token !== null
  }

  /**
   * Without a token the page is for this machine alone: a name in `Host` that is not this machine's has
   * been bent to it (DNS rebinding). With a token such a name gets nowhere, since browsers keep cookies by name.
   */
  isKnownHost({ host }: Pick<Asker, 'host'>): boolean {
    if (this.#token !== null) return true
    const name = hostName(host)
    return name !== null && (isLoopbackHost(name) || name === this.#ownHost)
  }

  /** Another site's page that fetches from here, rather than leads here. */
  isForeign({ fetchSite, fetchMode }: Pick<Asker, 'fetchSite' | 'fetchMode'>): boolean {
    return (fetchSite === 'cross-site' || fetchSite === 'same-site') && fetchMode !== 'navigate'
  }

  mayLook({ authorization, cookie }: Pick<Asker, 'authorization' | 'cookie'>, now: number): boolean {
    if (this.#token === null) return true
    const bearer = /^Bearer +(\S+)$/i.exec(authorization ?? '')?.[1]
    if (bearer !== undefined) return this.#isToken(bearer)
    const [, until = '', mark = ''] =
      new RegExp(`(?:^|;\\s*)${cookieName}=(\\d{1,15})\\.([0-9a-f]{64})(?:;|$)`).exec(cookie ?? '') ?? []
    return until !== '' && now < Number(until) && areEqual(mark, this.#mark(until))
  }

  /** The cookie of a right token; `wrong`, or `too-often` after twenty wrong ones within a minute. */
  login(token: string, now: number): { readonly cookie: string } | 'wrong' | 'too-often' {
    this.#failures = this.#failures.filter((at) => at <= now && now - at < 60_000)
    if (this.#failures.length >= mostFailuresAMinute) return 'too-often'
    if (!this.#isToken(token)) {
      this.#failures.push(now)
      return 'wrong'
    }
    const until = String(Math.round(now) + stayMs)
    const secure = this.#secure ? '; Secure' : ''
    return {
      cookie: `${cookieName}=${until}.${this.#mark(until)}; Path=/; HttpOnly; SameSite=Strict; Max-Age=${stayMs / 1000}${secure}`,
    }
  }

  #isToken(given: string): boolean {
    return this.#token !== null && areEqual(given, this.#token)
  }

  /** Holds for one token: with a new one every earlier cookie is void. */
  #mark(until: string): string {
    return createHmac('sha256', this.#token ?? '')
      .update(`page until ${until}`)
      .digest('hex')
  }
}

/** In a time that does not depend on where, or whether by length, the two differ. */
const areEqual = (a: string, b: string): boolean => timingSafeEqual(digest(a), digest(b))
const digest = (text: string): Buffer => createHash('sha256').update(text).digest()

function hostName(host: string | undefined): string | null {
  const [, bracketed, plain] = /^(?:\[([0-9a-f:.]+)\]|([^:/@\s]+))(?::\d{1,5})?$/i.exec(host ?? '') ?? []
  return (bracketed ?? plain)?.toLowerCase() ?? null
}

/** Whether a host is this machine itself: localhost (RFC 6761), 127.0.0.0/8 (RFC 1122) or ::1 (RFC 4291). */
export const isLoopbackHost = (host: string): boolean =>
  /^(localhost|127(\.\d{1,3}){3}|\[?::1\]?)$/i.test(host.replace(/\.$/, ''))
