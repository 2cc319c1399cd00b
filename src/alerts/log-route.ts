import type { RouteSettings } from '../settings/schema.ts'
import { trialAlert } from './alert-book.ts'
import { cloudEvent } from './cloud-event.ts'
import { type Attempt, type Log, type Message, type Route, sent } from './route.ts'

export type LogSettings = Extract<RouteSettings, { log: unknown }>

/** Writes alerts into the structured log, as the same events that other routes carry. */
export function logRoute(name: string, settings: LogSettings, source: string, log: Log): Route {
  const send = async (message: Message): Promise<Attempt> => {
    const event = cloudEvent(message, source)
    if (message.type === 'heartbeat') log('info', 'The monitor is alive.', { route: name, event })
    else {
      const { alert } = message
      const calls = !alert.trial && alert.ended === null && !alert.withheld
      log(calls ? 'warn' : 'info', alert.sentence, { route: name, event })
    }
    return sent('written to the log')
  }
  return {
    name,
    kind: 'log',
    giveUpAfterMs: settings['give-up-after'],
    resendEveryMs: null,
    send,
    resend: async () => null,
    check: async () => sent('the log is always there'),
    trial: (now) => send({ type: 'alert', alert: trialAlert(now) }),
    async close() {},
  }
}
