import { type DestinationStream, type LevelWithSilent, pino } from 'pino'

export type LogLevel = 'error' | 'warn' | 'info' | 'debug'
export type LogFields = Readonly<Record<string, unknown>>
export type Log = (level: LogLevel, sentence: string, fields?: LogFields) => void

/** The same sentence is written at most so often a minute; the rest are counted and told with the next. */
const mostAMinute = 20
const minuteMs = 60_000
const mostSentences = 1000

/** What JSON leaves as it is but a terminal obeys or does not show: DEL and C1 controls, signs of direction and width. */
const unseen = /[\u007f-\u009f\u200b-\u200f\u2028-\u202e\u2060-\u2069\ufeff]/g
const escaped = (sign: string): string => `\\u${sign.charCodeAt(0).toString(16).padStart(4, '0')}`

export interface LogOptions {
  readonly level: LogLevel
  /** Where lines go; each is one JSON object, so that no text from outside can make a line of its own. */
  readonly destination: DestinationStream
  /** Takes secrets out of a text. */
  readonly redact: (text: string) => string
  /** Milliseconds since 1970 UTC. */
  now(): number
}

/** Structured log: one JSON object a line with time, level, the sentence and its fields. */
export function structuredLog({ level, destination, redact, now }: LogOptions): Log {
  const logger = pino(
    {
      level: level satisfies LevelWithSilent,
      base: null,
      messageKey: 'message',
      timestamp: () => `,"time":"${new Date(now()).toISOString()}"`,
      formatters: { level: (label) => ({ level: label }) },
    },
    { write: (line: string) => destination.write(redact(line).replaceAll(unseen, escaped)) },
  )
  const spoken = new Map<string, { since: number; count: number; held: number }>()
  return (at, sentence, fields = {}) => {
    const time = now()
    let said = spoken.get(sentence)
    if (said === undefined || time - said.since >= minuteMs) {
      if (spoken.size >= mostSentences) spoken.clear()
      const held = said?.held ?? 0
      said = { since: time, count: 0, held: 0 }
      spoken.set(sentence, said)
      if (held > 0) fields = { ...fields, heldBack: held }
    }
    if (++said.count > mostAMinute) {
      said.held++
      return
    }
    logger[at](plain(fields), sentence)
  }
}

/** Errors by their message: JSON alone would make `{}` of them. */
const plain = (fields: LogFields): LogFields =>
  Object.fromEntries(
    Object.entries(fields).map(([name, value]) => [name, value instanceof Error ? value.message : value]),
  )
