import { createServer, type IncomingHttpHeaders, type Server } from 'node:http'
import { freePort, until } from '../../support/host.ts'

export interface ReceivedRequest {
  readonly method: string
  readonly path: string
  readonly headers: IncomingHttpHeaders
  readonly body: string
}

export interface Reply {
  readonly status: number
  readonly headers?: Readonly<Record<string, string>>
  readonly body?: string
  /** Milliseconds to wait before it answers. */
  readonly afterMs?: number
}

/**
 * A small HTTP server that records what it is sent, in order. `reply` decides the answer to each request
 * (default: 200). It can be stopped and started again on its port.
 */
export class Receiver {
  readonly port: number
  readonly requests: ReceivedRequest[] = []
  reply: (request: ReceivedRequest, index: number) => Reply = () => ({ status: 200 })
  #server: Server | null = null

  private constructor(port: number) {
    this.port = port
  }

  static async start(port?: number): Promise<Receiver> {
    const receiver = new Receiver(port ?? (await freePort()))
    await receiver.restart()
    return receiver
  }

  get url(): string {
    return `http://127.0.0.1:${this.port}`
  }

  async restart(): Promise<void> {
    const server = createServer((request, response) => {
      const chunks: Buffer[] = []
      request.on('data', (chunk: Buffer) => chunks.push(chunk))
      request.on('end', () => {
        const received = {
          method: request.method ?? '',
          path: request.url ?? '',
          headers: request.headers,
          body: Buffer.concat(chunks).toString(),
        }
        const reply = this.reply(received, this.requests.length)
        this.requests.push(received)
        const answer = () => response.writeHead(reply.status, { ...reply.headers }).end(reply.body ?? '')
        if (reply.afterMs) setTimeout(answer, reply.afterMs).unref()
        else answer()
      })
    })
    await new Promise<void>((resolve, reject) => {
      server.once('error', reject)
      server.listen(this.port, '127.0.0.1', resolve)
    })
    this.#server = server
  }

  /** Closes the port and cuts what is open. */
  async stop(): Promise<void> {
    const server = this.#server
    this.#server = null
    if (!server) return
    await new Promise<void>((resolve) => {
      server.close(() => resolve())
      server.closeAllConnections()
    })
  }

  /** Waits until `count` requests that pass `wanted` have come, and gives them. */
  waitFor(
    count: number,
    wanted: (request: ReceivedRequest) => boolean = () => true,
    withinMs = 30_000,
  ): Promise<ReceivedRequest[]> {
    const ask = async () => {
      const found = this.requests.filter(wanted)
      return found.length >= count && found
    }
    return until(`${count} requests at the receiver`, ask, { withinMs, everyMs: 25 })
  }
}
