import { z } from 'zod'

/** What may stand at a place, in the words of an error message; schemas made from an entry inherit it. */
export const allowedWords = z.registry<{ allowed: string }>()

const milliseconds: Readonly<Record<string, number>> = {
  ms: 1,
  s: 1e3,
  m: 60e3,
  min: 60e3,
  h: 3600e3,
  d: 86400e3,
}

export const text = z.string().min(1).max(1000)
export const count = z.number().int().min(1).max(1_000_000)

/** A duration such as `250ms`, `5s`, `10m`, `2h`, `90d`; becomes milliseconds. */
export const duration = z
  .string()
  .regex(/^\d{1,9}(\.\d{1,6})?(ms|s|m|min|h|d)$/, 'a duration such as 250ms, 5s, 10m, 2h or 90d')
  .transform((written) => {
    const [, number = '', unit = ''] = /^([\d.]+)([a-z]+)$/.exec(written) ?? []
    return Number(number) * (milliseconds[unit] ?? Number.NaN)
  })
  .register(allowedWords, { allowed: 'a duration such as 250ms, 5s, 10m, 2h or 90d' })

/** `1 per 90d`: so many false pages in so much time. */
export const falsePages = z
  .string()
  .regex(/^\d{1,6}(\.\d{1,6})? per \d{1,9}(\.\d{1,6})?(ms|s|m|min|h|d)$/, 'a budget such as "1 per 90d"')
  .transform((written) => {
    const [pages = '', , span = ''] = written.split(' ')
    return { pages: Number(pages), per: duration.parse(span) }
  })
  .register(allowedWords, { allowed: 'a budget such as "1 per 90d"' })

export const timeOfDay = z
  .string()
  .regex(/^([01]\d|2[0-3]):[0-5]\d$/, 'a time of day such as "09:00"')
  .register(allowedWords, { allowed: 'a time of day such as "09:00"' })

export const name = z
  .string()
  .regex(/^[a-z][a-z0-9-]{0,62}$/, 'a name of lower-case letters, digits and hyphens')
  .register(allowedWords, {
    allowed: 'a name of lower-case letters, digits and hyphens that begins with a letter',
  })

/** Address of an HTTP service, without a user name or password in it. */
export const httpUrl = z
  .url({ protocol: /^https?$/, normalize: false })
  .regex(/^https?:\/\/[^@/?#]+([/?#].*)?$/, 'an http or https address without a user name in it')
  .register(allowedWords, { allowed: 'an http or https address without a user name or password in it' })

export const broker = z
  .string()
  .regex(/^(\[[0-9a-fA-F:.]+\]|[A-Za-z0-9._-]+):\d{1,5}$/, 'HOST:PORT')
  .register(allowedWords, { allowed: 'HOST:PORT, such as kafka-1.example:9092' })

export const listenAddress = z
  .string()
  .regex(/^(\[[0-9a-fA-F:.]+\]|[A-Za-z0-9.-]+):\d{1,5}$/, 'ADDRESS:PORT')
  .register(allowedWords, { allowed: 'ADDRESS:PORT, such as 127.0.0.1:8450 or [::1]:8450' })

/** RFC 6901 pointer; the empty text points at the whole. */
export const pointer = z
  .string()
  .max(1000)
  .regex(/^(\/([^~/]|~[01])*)*$/, 'an RFC 6901 pointer such as /sym')
  .register(allowedWords, { allowed: 'an RFC 6901 pointer such as /sym' })

export const timeUnit = z.enum(['rfc3339', 's', 'ms', 'us', 'ns'])

/** The days that `mon-fri`, `mon,wed,fri` or `sun-thu` name, Sunday being 0; null where it names none. */
export function parseDays(written: string): readonly number[] | null {
  const names = ['sun', 'mon', 'tue', 'wed', 'thu', 'fri', 'sat']
  const days = new Set<number>()
  for (const part of written.toLowerCase().split(',')) {
    const [from = '', to = from, ...rest] = part.trim().split('-')
    const first = names.indexOf(from)
    const last = names.indexOf(to)
    if (first < 0 || last < 0 || rest.length > 0) return null
    for (let day = first; ; day = (day + 1) % 7) {
      days.add(day)
      if (day === last) break
    }
  }
  return [...days].sort((a, b) => a - b)
}
