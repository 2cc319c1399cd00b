import { once } from 'node:events'
import type { Writable } from 'node:stream'
import {
  findingRecord,
  frameRecord,
  shiftRecord,
  type TautlineRecord,
  transitionRecord,
} from '../observe/records.ts'
import type { Outcome } from '../pipeline.ts'

/** Writes records as NDJSON and waits for a slow reader: nothing piles up. */
export class RecordWriter {
  readonly #out: Writable
  readonly #every: number

  /** `every`: one frame record every so many frames. */
  constructor(out: Writable, every: number) {
    this.#out = out
    this.#every = every
  }

  /** The records of an outcome, frame by frame, what is said about a frame behind it. */
  async outcome({ judged, findings }: Outcome): Promise<void> {
    let lines = ''
    for (const { ensemble, finding } of findings) lines += line(findingRecord(ensemble, finding))
    for (const one of judged) {
      if (one.frame % this.#every === 0) lines += line(frameRecord(one))
      for (const transition of one.verdict.transitions)
        lines += line(transitionRecord(one.ensemble, transition))
      if (one.verdict.shift !== null) lines += line(shiftRecord(one.ensemble, one.verdict.shift))
    }
    await this.#write(lines)
  }

  async record(record: TautlineRecord): Promise<void> {
    await this.#write(line(record))
  }

  async #write(text: string): Promise<void> {
    if (text !== '' && !this.#out.write(text)) await once(this.#out, 'drain')
  }
}

const line = (record: TautlineRecord): string => `${JSON.stringify(record)}\n`
