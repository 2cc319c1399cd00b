export interface Backoff {
  readonly firstMs: number
  readonly longestMs: number
}

export const defaultBackoff: Backoff = { firstMs: 1000, longestMs: 60_000 }

/**
 * Milliseconds to wait after `failures` failures in a row (from 1): doubling from the first to the longest
 * wait, of which a random half is taken off so that senders do not fall into step. `random` in [0, 1).
 */
export function backoffMs(failures: number, random: number, { firstMs, longestMs }: Backoff): number {
  const whole = Math.min(longestMs, firstMs * 2 ** Math.min(failures - 1, 40))
  return whole * (0.5 + 0.5 * random)
}
