import { randomBytes } from 'node:crypto'
import fastify, { type FastifyInstance, type FastifyReply, type FastifyRequest } from 'fastify'
import { TautlineError } from '../errors.ts'
import { Access, type Asker, isLoopbackHost } from './access.ts'
import { clientAssets } from './assets.ts'
import { EventStreams, type StreamLimits } from './event-streams.ts'
import { loginHtml, pageHtml } from './frame-html.ts'
import type { PageState } from './page-state.ts'

const tickMs = 100
/** The page counts the stream as lost after 4.5 s of silence. */
const beatMs = 2000

export interface HealthAnswer {
  readonly ok: boolean
  readonly body: unknown
}

export interface PageOptions {
  /** `ADDRESS:PORT`; elsewhere than on loopback a token is needed. */
  readonly listen: string
  readonly token?: string
  /** Address under which people reach the page. */
  readonly url?: string
  readonly state: PageState
  metrics(): Promise<{ readonly contentType: string; readonly body: string }>
  live(): HealthAnswer
  ready(): HealthAnswer
  /** Newest first, bounded. */
  quarantine(): readonly unknown[]
  /** The present version of an alert, null where there is none of that id. */
  alert(id: string): unknown
  /** The journal of an ensemble, oldest first, bounded. */
  regimes?(ensemble: string): readonly unknown[]
  /** Milliseconds since 1970 UTC. */
  now(): number
  /** Folder of the compiled client; by default beside this module. */
  readonly clientFolder?: URL
  readonly limits?: StreamLimits
}

export interface PageServer {
  /** Where it listens. */
  readonly url: string
  /** Ends the streams, then stops listening. */
  close(): Promise<void>
}

/** Serves the page until it is closed. @throws TautlineError `settings-exposed`, `page-unopened`, `page-unbuilt` */
export async function pageServer(options: PageOptions): Promise<PageServer> {
  const { host, port } = addressOf(options.listen)
  if (options.token === undefined && !isLoopbackHost(host))
    throw new TautlineError(
      'settings-exposed',
      `page.listen is ${options.listen}, and page.token is not set.`,
    )
  const server = await pageApp(options)
  try {
    await server.listen({ host, port })
  } catch (error) {
    await server.close()
    throw new TautlineError(
      'page-unopened',
      `${options.listen}: ${(error as NodeJS.ErrnoException).code ?? error}.`,
    )
  }
  const bound = server.server.address()
  const boundPort = typeof bound === 'object' && bound !== null ? bound.port : port
  const named = host.includes(':') ? `[${host}]` : host
  return { url: `http://${named}:${boundPort}/`, close: () => server.close() }
}

/** The server without a socket, for tests by injection. @throws TautlineError `page-unbuilt` */
export async function pageApp(options: PageOptions): Promise<FastifyInstance> {
  const { state, now } = options
  const access = new Access({ token: options.token ?? null, url: options.url ?? null })
  const assets = await clientAssets(options.clientFolder)
  const streams = new EventStreams(randomBytes(6).toString('hex'), options.limits)
  const server = fastify({ bodyLimit: 4096, forceCloseConnections: true })

  const timers = [
    setInterval(() => {
      const change = state.changes(now())
      if (change !== null) streams.publish(change)
    }, tickMs),
    setInterval(() => streams.beat(now()), beatMs),
  ]
  for (const timer of timers) timer.unref()
  server.addHook('preClose', (done) => {
    for (const timer of timers) clearInterval(timer)
    streams.close()
    done()
  })

  server.addContentTypeParser(
    'application/x-www-form-urlencoded',
    { parseAs: 'string' },
    (_request, body, done) => done(null, new URLSearchParams(String(body))),
  )
  server.addHook('onRequest', async (request, reply) => {
    reply.headers(safeHeaders)
    const asker = askerOf(request)
    if (!access.isKnownHost(asker))
      return refuse(reply, 421, 'This name does not lead to the monitor; use 127.0.0.1 or localhost.')
    if (access.isForeign(asker)) return refuse(reply, 403, 'Another site may not read from here.')
    if (isOpen(request.url) || access.mayLook(asker, now())) return
    if (request.url.split('?')[0] === '/') return html(reply.code(401), loginHtml('', linkedQuery(request)))
    reply.header('www-authenticate', 'Bearer realm="tautline"')
    return refuse(reply, 401, 'The token of the page is needed: Authorization: Bearer TOKEN.')
  })
  server.setNotFoundHandler((_request, reply) => refuse(reply, 404, 'There is nothing here.'))
  server.setErrorHandler((error: { statusCode?: number }, _request, reply) => {
    const status = error.statusCode ?? 500
    refuse(reply, status, status < 500 ? 'The request is not understood.' : 'The monitor could not answer.')
  })

  server.get('/', (_request, reply) => html(reply, pageHtml))
  server.get<{ Params: { name: string } }>('/assets/:name', (request, reply) => {
    const asset = assets.get(request.params.name)
    if (asset === undefined) return reply.callNotFound()
    reply.headers({ 'cache-control': 'no-cache', etag: asset.etag }).type(asset.type)
    return request.headers['if-none-match'] === asset.etag ? reply.code(304).send() : reply.send(asset.body)
  })
  server.get('/state', () => state.view(now()))
  server.get<{ Querystring: { after?: unknown } }>(
    '/events',
    { exposeHeadRoute: false },
    (request, reply) => {
      if (streams.full) return refuse(reply, 503, 'Too many pages are open.')
      const said = request.headers['last-event-id'] ?? request.query.after
      openStream(reply, streams, () =>
        streams.open(reply.raw, typeof said === 'string' ? said : null, () => state.view(now())),
      )
      return reply
    },
  )
  server.get('/metrics', async (_request, reply) => {
    const { contentType, body } = await options.metrics()
    return reply.header('content-type', contentType).send(body)
  })
  for (const path of ['live', 'ready'] as const)
    server.get(`/health/${path}`, (request, reply) => {
      const { ok, body } = options[path]()
      const said = access.mayLook(askerOf(request), now()) ? body : { ok }
      return reply.code(ok ? 200 : 503).send(said)
    })
  server.get('/quarantine', () => ({ records: options.quarantine() }))
  server.get<{ Params: { '*': string } }>('/alerts/*', (request, reply) => {
    const alert = options.alert(request.params['*'])
    return alert === null || alert === undefined ? reply.callNotFound() : reply.send(alert)
  })
  if (options.regimes !== undefined) {
    const { regimes } = options
    server.get<{ Params: { ensemble: string } }>('/regimes/:ensemble', (request) => ({
      entries: regimes(request.params.ensemble),
    }))
  }
  if (access.needsToken) {
    server.get('/login', (request, reply) => reply.redirect(`/${linkedQuery(request)}`, 303))
    server.post('/login', (request, reply) => {
      const query = linkedQuery(request)
      const token = request.body instanceof URLSearchParams ? request.body.get('token') : null
      const answer = access.login(token ?? '', now())
      if (answer === 'too-often')
        return html(reply.code(429), loginHtml('Too many wrong tokens; wait a minute.', query))
      if (answer === 'wrong') return html(reply.code(401), loginHtml('This is not the token.', query))
      return reply.header('set-cookie', answer.cookie).redirect(`/${query}`, 303)
    })
  }
  return server
}

function openStream(reply: FastifyReply, streams: EventStreams, begin: () => void): void {
  const { raw } = reply
  reply.hijack()
  raw.writeHead(200, {
    ...safeHeaders,
    'content-type': 'text/event-stream; charset=utf-8',
    'x-accel-buffering': 'no',
    connection: 'close',
  })
  raw.on('close', () => streams.gone(raw))
  raw.on('error', () => streams.gone(raw))
  begin()
}

const safeHeaders = {
  'content-security-policy':
    "default-src 'none'; script-src 'self'; style-src 'self'; img-src 'self'; connect-src 'self'; form-action 'self'; base-uri 'none'; frame-ancestors 'none'",
  'x-content-type-options': 'nosniff',
  'referrer-policy': 'no-referrer',
  'cross-origin-opener-policy': 'same-origin',
  'cross-origin-resource-policy': 'same-origin',
  'cache-control': 'no-store',
} as const

/** What tells nothing of the state, or only whether the monitor is well, is open to all. */
const isOpen = (url: string): boolean => /^\/(assets\/|health\/|login(\?|$))/.test(url)

const refuse = (reply: FastifyReply, status: number, sentence: string): FastifyReply =>
  reply.code(status).send({ ok: false, sentence })

const html = (reply: FastifyReply, text: string): FastifyReply =>
  reply.type('text/html; charset=utf-8').send(text)

/** The part of a link that names an ensemble, and nothing else of it, so that a login leads nowhere but here. */
function linkedQuery({ query }: FastifyRequest): string {
  const { ensemble } = query as { readonly ensemble?: unknown }
  return typeof ensemble === 'string' ? `?ensemble=${encodeURIComponent(ensemble)}` : ''
}

function askerOf({ headers }: FastifyRequest): Asker {
  const one = (value: string | string[] | undefined) => (Array.isArray(value) ? value[0] : value)
  return {
    host: headers.host,
    authorization: headers.authorization,
    cookie: headers.cookie,
    fetchSite: one(headers['sec-fetch-site']),
    fetchMode: one(headers['sec-fetch-mode']),
  }
}

function addressOf(listen: string): { readonly host: string; readonly port: number } {
  const [, bracketed, plain = '127.0.0.1', port = '8450'] =
    /^(?:\[([^\]]+)\]|([^:]+)):(\d{1,5})$/.exec(listen) ?? []
  return { host: bracketed ?? plain, port: Number(port) }
}
