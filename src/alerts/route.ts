import type { Alert, Pulse } from './alert.ts'

/** What travels to a route: one version of an alert, or a sign of life. */
export type Message =
  | { readonly type: 'alert'; readonly alert: Alert }
  | { readonly type: 'heartbeat'; readonly pulse: Pulse; readonly everyMs: number }

/** How one try to hand a message over went. Never holds a secret. */
export type Attempt =
  | { readonly ok: true; readonly detail: string }
  | {
      readonly ok: false
      readonly detail: string
      /** True where any other message would have failed too: nobody answered, or asked for patience. */
      readonly routeWide: boolean
      /** How long the other side asked to be left alone, in milliseconds; null where it did not. */
      readonly retryAfterMs: number | null
    }

/**
 * A way out for alerts. `now` is in milliseconds since 1970 UTC. No method throws; all give up when `signal`
 * is aborted. Sending the same message twice is harmless: receivers know versions by their id, and by the
 * version a repetition that comes late.
 */
export interface Route {
  readonly name: string
  readonly kind: 'alertmanager' | 'webhook' | 'kafka' | 'log'
  readonly giveUpAfterMs: number
  /** How often the other side wants to be told again of what stands; null where once is enough. */
  readonly resendEveryMs: number | null
  send(message: Message, now: number, signal: AbortSignal): Promise<Attempt>
  /** Tells the present state of these alerts again; null where there is nothing to tell. */
  resend(alerts: readonly Alert[], now: number, signal: AbortSignal): Promise<Attempt | null>
  /** Tries the way without sending anything that people would see. */
  check(signal: AbortSignal): Promise<Attempt>
  /** Sends a marked trial. */
  trial(now: number, signal: AbortSignal): Promise<Attempt>
  close(): Promise<void>
}

/** A structured line for the log: a plain sentence and its fields. */
export type Log = (
  level: 'info' | 'warn' | 'error',
  sentence: string,
  fields: Readonly<Record<string, unknown>>,
) => void

export const sent = (detail: string): Attempt => ({ ok: true, detail })

export const unsent = (
  detail: string,
  { routeWide = true, retryAfterMs = null }: { routeWide?: boolean; retryAfterMs?: number | null } = {},
): Attempt => ({ ok: false, detail, routeWide, retryAfterMs })
