import { Observable, type Subscriber } from 'rxjs'
import { TautlineError } from '../errors.ts'
import type { FormatSettings } from '../settings/schema.ts'
import { BatchBuilder, batchSize } from './batch-builder.ts'
import { type ByteSource, FileSource, StreamSource } from './byte-source.ts'
import { type FeedContext, type FeedTimer, systemTimer } from './context.ts'
import type { Feed, FeedEvent, Position } from './feed.ts'
import { Gate } from './gate.ts'
import { textOf } from './gunzip-source.ts'
import { handOver } from './hand-over.ts'
import { NameTable } from './name-table.ts'
import { Pace } from './pace.ts'
import { readerFor } from './reader-for.ts'
import { RecordBuffer } from './record-buffer.ts'
import type { RecordReader } from './record-reader.ts'

/** Where recorded readings come from. */
export interface Recording {
  readonly kind: 'file' | 'stdin'
  /** Path of the file, or `stdin`. */
  readonly source: string
  readonly format: FormatSettings
  /** Longest record, bytes. */
  readonly limit: number
  /** Event time over real time; null: as fast as it can. */
  readonly pace: number | null
}

/** Decompressed byte offset and line of the first unread record. */
interface Place {
  readonly offset: number
  readonly line: number
}

/** A source under way. */
interface Opened {
  readonly bytes: ByteSource
  /** The same, decompressed. */
  readonly text: ByteSource
  readonly gzip: boolean
  readonly out: BatchBuilder
  readonly buffer: RecordBuffer
}

const beginning: Place = { offset: 0, line: 1 }

const writePlace = ({ offset, line }: Place): string => `${offset}:${line}`

function readPlace(written: string | undefined): Place {
  const [, offset, line] = /^([0-9]{1,15}):([0-9]{1,15})$/.exec(written ?? '') ?? []
  return offset === undefined ? beginning : { offset: Number(offset), line: Number(line) }
}

/**
 * A recorded file or standard input, plain or gzip: one source, read once from its beginning or from where
 * the last run stopped (files only) to its end. Raises `feed-file`, `feed-columns`, `feed-encoding`.
 */
export class RecordedFeed implements Feed {
  readonly name: string
  readonly kind: 'file' | 'stdin'
  readonly events: Observable<FeedEvent>
  readonly #recording: Recording
  readonly #context: FeedContext
  readonly #timer: FeedTimer
  readonly #gate = new Gate()

  constructor(name: string, recording: Recording, context: FeedContext) {
    this.name = name
    this.kind = recording.kind
    this.#recording = recording
    this.#context = context
    this.#timer = context.timer ?? systemTimer
    this.events = new Observable((subscriber) => {
      const stop = new AbortController()
      this.#run(subscriber, stop.signal).catch((error) => subscriber.error(error))
      return () => stop.abort()
    })
  }

  hold(source: string, held: boolean): void {
    if (source === this.#recording.source) this.#gate.set(held)
  }

  async commit(_position: Position): Promise<void> {}

  /** Opens it and reads the first record that there is; leaves standard input untouched. */
  async check(): Promise<{ readonly ok: boolean; readonly detail: string }> {
    if (this.kind === 'stdin') {
      const terminal = (this.#context.stdin ?? process.stdin) === process.stdin && process.stdin.isTTY
      return { ok: true, detail: terminal ? 'standard input is this terminal' : 'standard input is open' }
    }
    let bytes: ByteSource | null = null
    try {
      bytes = await FileSource.open(this.#recording.source)
      return await this.#tryFirst(bytes)
    } catch (error) {
      if (!(error instanceof TautlineError)) throw error
      return { ok: false, detail: `${error.message} ${error.remedy}` }
    } finally {
      await bytes?.close()
    }
  }

  async #tryFirst(bytes: ByteSource): Promise<{ ok: boolean; detail: string }> {
    const { text, gzip } = await textOf(bytes)
    const out = this.#builder(1)
    const reader = this.#reader(out.names)
    const buffer = new RecordBuffer(reader, this.#recording.limit)
    for (let more = true; more && out.empty && buffer.failure === null; ) {
      more = await load(text, buffer)
      buffer.read(out)
    }
    if (buffer.failure !== null) throw buffer.failure
    const how = gzip ? 'gzip' : 'plain'
    const [refused] = out.quarantined
    if (refused !== undefined)
      return { ok: false, detail: `line ${refused.position} (${how}): ${refused.detail}: ${refused.start}` }
    if (out.count === 0) return { ok: false, detail: `${how}, holds no reading` }
    const name = out.names.names[out.signal[0]!]!
    const time = new Date(out.time[0]!).toISOString()
    return { ok: true, detail: `${how}; first reading: ${name} at ${time}, ${out.value[0]}` }
  }

  #builder(size: number): BatchBuilder {
    return new BatchBuilder(this.name, this.#recording.source, new NameTable(), this.#context.now, size)
  }

  #reader(names: NameTable): RecordReader {
    return readerFor(this.#recording.format, this.#recording.limit, names)
  }

  /** The source opened at a place, or null when it is shorter than that. */
  async #openAt(place: Place): Promise<Opened | null> {
    const { kind, source, limit, pace } = this.#recording
    const bytes =
      kind === 'file' ? await FileSource.open(source) : new StreamSource(this.#context.stdin ?? process.stdin)
    try {
      const { text, gzip } = await textOf(bytes)
      const out = this.#builder(pace === null ? batchSize : 1)
      const buffer = new RecordBuffer(this.#reader(out.names), limit)
      const opened: Opened = { bytes, text, gzip, out, buffer }
      if (place.offset === 0 || (await this.#goTo(place, opened))) return opened
    } catch (error) {
      await bytes.close()
      throw error
    }
    await bytes.close()
    return null
  }

  /** Goes to where the last run stopped; CSV reads its header line on the way. */
  async #goTo(place: Place, { text, gzip, bytes, out, buffer }: Opened): Promise<boolean> {
    if (!gzip && bytes instanceof FileSource && bytes.size < place.offset) return false
    const { format } = this.#recording
    if (typeof format === 'object' && 'csv' in format) {
      const header = new BatchBuilder(this.name, out.source, out.names, this.#context.now, 0)
      for (let more = true; more && buffer.offset === 0 && buffer.failure === null; ) {
        more = await load(text, buffer)
        buffer.read(header)
      }
    }
    const further = buffer.jump(place.offset)
    out.line = place.line
    return (await text.skip(further)) === further
  }

  async #run(to: Subscriber<FeedEvent>, stop: AbortSignal): Promise<void> {
    const { kind, source, pace } = this.#recording
    const place = kind === 'file' ? readPlace(this.#context.resumeAt?.[source]) : beginning
    let opened = await this.#openAt(place)
    if (opened === null) {
      this.#context.log(
        'warn',
        'a file is shorter than where the last run stopped; it is read from its beginning',
        {
          feed: this.name,
          file: source,
        },
      )
      opened = await this.#openAt(beginning)
    }
    if (opened === null) return
    const { bytes } = opened
    const close = () =>
      void bytes.close().catch((error: unknown) => {
        this.#context.log('debug', 'a source could not be closed', { feed: this.name, error: String(error) })
      })
    stop.addEventListener('abort', close, { once: true })
    try {
      if (stop.aborted) return
      to.next({ type: 'connected' })
      to.next({ type: 'assigned', sources: [source] })
      await this.#play(opened, pace === null ? null : new Pace(pace, this.#timer), to, stop)
      if (stop.aborted) return
      to.next({ type: 'caught-up', source })
      to.next({ type: 'ended', source })
      to.complete()
    } finally {
      stop.removeEventListener('abort', close)
      close()
    }
  }

  async #play(
    opened: Opened,
    pace: Pace | null,
    to: Subscriber<FeedEvent>,
    stop: AbortSignal,
  ): Promise<void> {
    const { bytes, text, gzip, out, buffer } = opened
    const { source } = this.#recording
    const give = async () => {
      await this.#gate.pass(stop)
      if (pace !== null && out.count > 0) await pace.due(out.time[out.count - 1]!, stop)
      const position = { [source]: writePlace({ offset: buffer.offset, line: out.line }) }
      const inFile = !gzip && bytes instanceof FileSource
      const behind = inFile ? Math.max(0, bytes.size - buffer.offset) : text.behind()
      await handOver(to, { ...out.given(), position, behind }, stop)
      out.reset()
    }
    let more = true
    let caughtUp = false
    while (!stop.aborted) {
      const hungry = buffer.read(out)
      const ended = hungry && !more
      if (ended && text.damage !== null) {
        out.nextRecord()
        out.refuse('bad-compression', text.damage, noBytes, 0, 0)
      }
      if (!out.empty) await give()
      if (buffer.failure !== null) throw buffer.failure
      if (ended) return
      if (hungry) {
        if (text.waiting === false && !caughtUp) to.next({ type: 'caught-up', source })
        caughtUp ||= text.waiting === false
        more = await load(text, buffer)
      }
    }
  }
}

const noBytes = Buffer.alloc(0)

/** Reads one piece into the buffer; false at the end. */
async function load(text: ByteSource, buffer: RecordBuffer): Promise<boolean> {
  const { bytes, at, length } = buffer.space()
  const got = await text.read(bytes, at, length)
  if (got > 0) buffer.filled(got)
  else buffer.finish(text.damage !== null)
  return got > 0
}
