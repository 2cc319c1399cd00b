import { createHmac } from 'node:crypto'
import { failed, ok, type Result, TautlineError } from '../errors.ts'

/** Shortest key, in bytes, as the Standard Webhooks specification recommends (24 to 64). */
const shortestKey = 24

/**
 * The key of a webhook secret: after `whsec_` the bytes that base64 stands for, else the text's own UTF-8
 * bytes. Fails with `route-secret`.
 */
export function webhookKey(secret: string): Result<Buffer> {
  const encoded = secret.startsWith('whsec_') ? secret.slice('whsec_'.length) : null
  if (encoded !== null && !/^[A-Za-z0-9+/]+={0,2}$/.test(encoded))
    return failed(new TautlineError('route-secret', 'What follows whsec_ is not base64.'))
  const key = encoded === null ? Buffer.from(secret) : Buffer.from(encoded, 'base64')
  if (key.length < shortestKey)
    return failed(new TautlineError('route-secret', `It has ${key.length} bytes.`))
  return ok(key)
}

/**
 * The three headers of the Standard Webhooks specification, version 1: HMAC-SHA256 over
 * `ID.TIMESTAMP.BODY`, the timestamp in whole seconds of the attempt. The full stop parts the fields, so
 * the id may not hold one.
 */
export function webhookHeaders(
  id: string,
  body: string,
  key: Buffer,
  now: number,
): Readonly<Record<string, string>> {
  const timestamp = String(Math.floor(now / 1000))
  const signature = createHmac('sha256', key).update(`${id}.${timestamp}.${body}`).digest('base64')
  return { 'webhook-id': id, 'webhook-timestamp': timestamp, 'webhook-signature': `v1,${signature}` }
}
