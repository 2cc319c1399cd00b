import { type Attempt, type Message, type Route, sent, unsent } from '../../../src/alerts/route.ts'
import type { FakeTime } from './fake-time.ts'

/** A route that answers as told, and keeps what it has taken, in order, as `ALERT/VERSION`. */
export class FakeRoute implements Route {
  readonly name: string
  readonly kind = 'webhook'
  readonly giveUpAfterMs: number
  readonly resendEveryMs: number | null
  readonly taken: string[] = []
  readonly tried: { readonly what: string; readonly at: number }[] = []
  readonly repeated: { readonly what: readonly string[]; readonly at: number }[] = []
  answer: (what: string) => Attempt | Promise<Attempt> = () => sent('taken')
  /** Most sends under way at the same moment. */
  mostAtOnce = 0
  #atOnce = 0
  readonly #time: FakeTime

  constructor(
    time: FakeTime,
    name = 'hook',
    { giveUpAfterMs = 3 * 86_400_000, resendEveryMs = null as number | null } = {},
  ) {
    this.#time = time
    this.name = name
    this.giveUpAfterMs = giveUpAfterMs
    this.resendEveryMs = resendEveryMs
  }

  async send(message: Message): Promise<Attempt> {
    const what =
      message.type === 'heartbeat'
        ? 'heartbeat'
        : `${message.alert.id.split('/').slice(0, 2).join('/')}/${message.alert.version}`
    this.tried.push({ what, at: this.#time.now() })
    this.mostAtOnce = Math.max(this.mostAtOnce, ++this.#atOnce)
    try {
      const attempt = await this.answer(what)
      if (attempt.ok) this.taken.push(what)
      return attempt
    } finally {
      this.#atOnce--
    }
  }

  async resend(alerts: Parameters<Route['resend']>[0]): Promise<Attempt | null> {
    if (alerts.length === 0) return null
    this.repeated.push({
      what: alerts.map(({ id, version }) => `${id.split('/')[0]}/${version}`),
      at: this.#time.now(),
    })
    return this.answer('repetition')
  }

  check = async (): Promise<Attempt> => sent('there')
  trial = async (): Promise<Attempt> => sent('tried')
  close = async (): Promise<void> => {}
}

export const down = (): Attempt => unsent('ECONNREFUSED')
