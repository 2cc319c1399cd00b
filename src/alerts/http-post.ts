import { connect as connectPlain } from 'node:net'
import { connect as connectTls } from 'node:tls'
import { type Attempt, sent, unsent } from './route.ts'

/** How much of an answer is read, for the log. */
const answerBytes = 2048
/** The longest wait that another side may ask for. */
const longestRetryAfterMs = 24 * 3_600_000
/** IMF-fixdate of RFC 9110, section 5.6.7. */
const httpDate = /^[A-Z][a-z]{2}, \d{2} [A-Z][a-z]{2} \d{4} \d{2}:\d{2}:\d{2} GMT$/

export interface Post {
  readonly url: URL
  readonly headers: Readonly<Record<string, string>>
  readonly body: string
  readonly timeoutMs: number
}

/** One HTTP POST. Redirects are not followed; of the answer only the first bytes are read. */
export async function post(request: Post, now: number, signal: AbortSignal): Promise<Attempt> {
  const timeout = AbortSignal.timeout(request.timeoutMs)
  try {
    const response = await fetch(request.url, {
      method: 'POST',
      headers: request.headers,
      body: request.body,
      redirect: 'manual',
      signal: AbortSignal.any([signal, timeout]),
    })
    if (response.ok) {
      await response.body?.cancel()
      return sent(`${request.url.host} answered ${response.status}`)
    }
    const words = await firstWords(response)
    return unsent(`${request.url.host} answered ${response.status}${refusal(response.status)}${words}`, {
      routeWide: isRouteWide(response.status),
      retryAfterMs: retryAfter(response.headers.get('retry-after'), now),
    })
  } catch (error) {
    if (signal.aborted) return unsent('the monitor is stopping')
    if (timeout.aborted) return unsent(`${request.url.host} did not answer within ${request.timeoutMs} ms`)
    return unsent(`${request.url.host}: ${causeOf(error)}`)
  }
}

/** Opens a connection to the host of `url`, with TLS where it is https, and closes it again. */
export function tryHost(url: URL, timeoutMs: number, signal: AbortSignal): Promise<Attempt> {
  const secure = url.protocol === 'https:'
  const port = url.port === '' ? (secure ? 443 : 80) : Number(url.port)
  const host = url.hostname.replaceAll(/[[\]]/g, '')
  return new Promise((resolve) => {
    const socket = secure ? connectTls({ host, port, servername: host }) : connectPlain({ host, port })
    const end = (attempt: Attempt) => {
      signal.removeEventListener('abort', stop)
      socket.destroy()
      resolve(attempt)
    }
    const stop = () => end(unsent('the check was stopped'))
    signal.addEventListener('abort', stop, { once: true })
    socket.setTimeout(timeoutMs, () => end(unsent(`${url.host} did not answer within ${timeoutMs} ms`)))
    socket.once(secure ? 'secureConnect' : 'connect', () => end(sent(`${url.host} takes connections`)))
    socket.once('error', (error) => end(unsent(`${url.host}: ${causeOf(error)}`)))
  })
}

/**
 * Milliseconds to wait after a Retry-After header (RFC 9110, section 10.2.3: seconds or an HTTP date), at
 * most a day; null where it is absent or cannot be read.
 */
export function retryAfter(header: string | null, now: number): number | null {
  if (header === null) return null
  const seconds = /^\d{1,9}$/.test(header)
  const ms = seconds ? Number(header) * 1000 : httpDate.test(header) ? Date.parse(header) - now : Number.NaN
  return Number.isFinite(ms) ? Math.min(Math.max(ms, 0), longestRetryAfterMs) : null
}

/**
 * A status of 400 to 499 speaks of this one message, but for those that speak of the sender or of its pace:
 * 401, 403, 404, 407, 408, 410, 429 (RFC 9110; RFC 6585).
 */
const isRouteWide = (status: number): boolean =>
  status < 400 || status > 499 || [401, 403, 404, 407, 408, 410, 429].includes(status)

const refusal = (status: number): string =>
  status >= 300 && status < 400 ? ' (a redirect, which is not followed)' : ''

async function firstWords(response: Response): Promise<string> {
  const reader = response.body?.getReader()
  if (reader === undefined) return ''
  const parts: Uint8Array[] = []
  let size = 0
  while (size < answerBytes) {
    const { value, done } = await reader.read()
    if (done) break
    parts.push(value)
    size += value.length
  }
  await reader.cancel()
  const text = Buffer.concat(parts).subarray(0, answerBytes).toString()
  const words = text.replaceAll(/[\p{Cc}\p{Cf}\s]+/gu, ' ').trim()
  return words === '' ? '' : `: ${words.slice(0, 200)}`
}

function causeOf(error: unknown): string {
  const cause = error instanceof Error && error.cause instanceof Error ? error.cause : error
  const code = (cause as { code?: unknown } | null)?.code
  if (typeof code === 'string') return code
  return cause instanceof Error ? cause.message : String(cause)
}
