import { z } from 'zod'

const units: Readonly<Record<string, number>> = { ms: 1, s: 1e3, m: 60e3, min: 60e3, h: 3600e3, d: 86400e3 }

/** A duration such as `250ms`, `5s`, `10m`, `2h`, `90d`; becomes milliseconds. */
export const duration = z
  .string()
  .regex(/^\d{1,9}(\.\d{1,6})?(ms|s|m|min|h|d)$/, 'a duration such as 250ms, 5s, 10m, 2h or 90d')
  .transform((text) => {
    const [, number = '', unit = ''] = /^([\d.]+)([a-z]+)$/.exec(text) ?? []
    return Number(number) * (units[unit] ?? Number.NaN)
  })
  .meta({ description: 'Duration: a number with ms, s, m (or min), h or d.' })

/** `1 per 90d`: so many false pages in so much time. */
export const falsePages = z
  .string()
  .regex(/^\d{1,6}(\.\d{1,6})? per \d{1,9}(\.\d{1,6})?(ms|s|m|min|h|d)$/, 'a budget such as "1 per 90d"')
  .transform((text) => {
    const [count = '', , span = ''] = text.split(' ')
    return { pages: Number(count), per: duration.parse(span) }
  })
  .meta({ description: 'False-page budget, such as "1 per 90d".' })
