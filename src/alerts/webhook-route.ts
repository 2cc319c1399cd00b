import { ok, type Result } from '../errors.ts'
import type { RouteSettings } from '../settings/schema.ts'
import { trialAlert } from './alert-book.ts'
import { cloudEvent, cloudEventsContentType } from './cloud-event.ts'
import { post, tryHost } from './http-post.ts'
import type { Attempt, Message, Route } from './route.ts'
import { webhookHeaders, webhookKey } from './webhook-signature.ts'

export type WebhookSettings = Extract<RouteSettings, { webhook: unknown }>

/**
 * A webhook: a CloudEvents 1.0 event in structured JSON, signed after the Standard Webhooks specification.
 * `webhook-id` is the event's id with every full stop as an underscore. Fails with
 * `route-secret`.
 */
export function webhookRoute(name: string, settings: WebhookSettings, source: string): Result<Route> {
  const { timeout: timeoutMs, 'give-up-after': giveUpAfterMs } = settings
  const url = new URL(settings.webhook.url)
  const key = webhookKey(settings.webhook.secret)
  if (!key.ok) return key

  const send = (message: Message, now: number, signal: AbortSignal): Promise<Attempt> => {
    const event = cloudEvent(message, source)
    const body = JSON.stringify(event)
    const headers = {
      'content-type': cloudEventsContentType,
      ...webhookHeaders(event.id.replaceAll('.', '_'), body, key.value, now),
    }
    return post({ url, headers, body, timeoutMs }, now, signal)
  }

  return ok({
    name,
    kind: 'webhook',
    giveUpAfterMs,
    resendEveryMs: null,
    send,
    resend: async () => null,
    check: (signal) => tryHost(url, timeoutMs, signal),
    trial: (now, signal) => send({ type: 'alert', alert: trialAlert(now) }, now, signal),
    async close() {},
  })
}
