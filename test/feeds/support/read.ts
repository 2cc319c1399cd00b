import { BatchBuilder } from '../../../src/feeds/batch-builder.ts'
import type { QuarantinedRecord } from '../../../src/feeds/feed.ts'
import { NameTable } from '../../../src/feeds/name-table.ts'
import { readerFor } from '../../../src/feeds/reader-for.ts'
import { RecordBuffer } from '../../../src/feeds/record-buffer.ts'
import { addDrops, type DropCounts } from '../../../src/reasons.ts'
import type { FormatSettings } from '../../../src/settings/schema.ts'

/** 2023-11-14T22:13:20Z. */
export const now = 1_700_000_000_000

export interface Outcome {
  readonly readings: readonly (readonly [string, number, number])[]
  readonly dropped: DropCounts
  readonly quarantined: readonly QuarantinedRecord[]
  /** Code and detail of the error that ended the reading, or null. */
  readonly error: string | null
  /** Where reading ended, in bytes. */
  readonly offset: number
  readonly line: number
}

export interface HowToRead {
  readonly limit?: number
  readonly fast?: boolean
  /** Lengths of the pieces in which the bytes come; the last one repeats. */
  readonly pieces?: readonly number[]
  /** Readings in a batch. */
  readonly size?: number
}

/** Reads bytes as the feed of a file does. */
export function readBytes(format: FormatSettings, bytes: Buffer, how: HowToRead = {}): Outcome {
  const { limit = 1 << 20, fast = true, pieces = [bytes.length || 1], size = 1000 } = how
  const names = new NameTable()
  const out = new BatchBuilder('test', 'test', names, () => now, size)
  const buffer = new RecordBuffer(readerFor(format, limit, names, { fast }), limit)
  const readings: [string, number, number][] = []
  const quarantined: QuarantinedRecord[] = []
  let dropped: DropCounts = {}
  const drain = () => {
    for (;;) {
      const hungry = buffer.read(out)
      for (let i = 0; i < out.count; i++)
        readings.push([names.names[out.signal[i]!]!, out.time[i]!, out.value[i]!])
      dropped = addDrops(dropped, out.dropped)
      quarantined.push(...out.quarantined)
      out.reset()
      if (hungry) return
    }
  }
  let given = 0
  for (let k = 0; given < bytes.length && buffer.failure === null; k++) {
    const { bytes: room, at, length } = buffer.space()
    const piece = Math.min(pieces[Math.min(k, pieces.length - 1)]!, length)
    const copied = bytes.copy(room, at, given, given + piece)
    buffer.filled(copied)
    given += copied
    drain()
  }
  if (buffer.failure === null) {
    buffer.finish(false)
    drain()
  }
  const error = buffer.failure === null ? null : `${buffer.failure.code}: ${buffer.failure.detail}`
  return { readings, dropped, quarantined, error, offset: buffer.offset, line: out.line }
}

/** Reads one message as the Kafka feed does. */
export function readMessage(format: FormatSettings, message: Buffer, how: HowToRead = {}): Outcome {
  const { limit = 1 << 20, fast = true } = how
  const names = new NameTable()
  const out = new BatchBuilder('test', 'test', names, () => now)
  const reader = readerFor(format, limit, names, { fast })
  reader.message(Buffer.concat([message, Buffer.from('\n')]), 0, message.length, out)
  const readings = Array.from(
    { length: out.count },
    (_, i) => [names.names[out.signal[i]!]!, out.time[i]!, out.value[i]!] as const,
  )
  const { dropped, quarantined, line } = out
  return { readings, dropped, quarantined, error: null, offset: message.length, line }
}
