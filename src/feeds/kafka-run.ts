import type { Kafka } from 'kafkajs'
import type { Subscriber } from 'rxjs'
import { TautlineError } from '../errors.ts'
import { BatchBuilder } from './batch-builder.ts'
import { type FeedContext, type FeedTimer, systemTimer } from './context.ts'
import { escapeText } from './escape.ts'
import type { FeedEvent, Position } from './feed.ts'
import { handOver } from './hand-over.ts'
import { loginRefusal, messageOf, topicFailure } from './kafka-errors.ts'
import type { KafkaRecording } from './kafka-feed.ts'
import { firstOffset } from './kafka-library.ts'
import { KafkaSession, longestWaitMs, offsetsOf, type PartitionOffsets } from './kafka-session.ts'
import { NameTable } from './name-table.ts'
import { PartitionLane } from './partition-lane.ts'
import { readerFor } from './reader-for.ts'

/** Fetched bytes that wait in memory, over all partitions and within one, roughly. */
const mostWaiting = 64 * 1024 * 1024
const leastPerPartition = 64 * 1024
const mostPerPartition = 4 * 1024 * 1024
/** Readings in one batch of a partition. */
const laneBatch = 8192
const firstDelayMs = 500
/** Jitter makes it a fifth longer at most: 9.6 s. */
const longestDelayMs = 8000

/**
 * One subscription to a Kafka feed: session after session until it is stopped. The lanes outlive the
 * sessions, so that after a reconnection no offset is given out twice or left out.
 */
export class KafkaRun {
  readonly #name: string
  readonly #recording: KafkaRecording
  readonly #context: FeedContext
  readonly #timer: FeedTimer
  readonly #kafka: Kafka
  readonly #to: Subscriber<FeedEvent>
  readonly #stop: AbortSignal
  readonly #names = new NameTable()
  readonly #lanes = new Map<number, PartitionLane>()
  #owned: ReadonlySet<number> = new Set()
  /** Partitions that were assigned before: another member may have read on in those not owned any more. */
  readonly #hadBefore = new Set<number>()
  #session: KafkaSession | null = null
  #joined = false
  #connected = false
  #everConnected = false
  /** Why it is cut off, as the log has it; null while connected. */
  #told: string | null = null
  #perPartition = mostPerPartition

  constructor(
    name: string,
    recording: KafkaRecording,
    context: FeedContext,
    kafka: Kafka,
    to: Subscriber<FeedEvent>,
    stop: AbortSignal,
  ) {
    this.#name = name
    this.#recording = recording
    this.#context = context
    this.#timer = context.timer ?? systemTimer
    this.#kafka = kafka
    this.#to = to
    this.#stop = stop
  }

  /** Runs until it is stopped. Raises `kafka-login` when the first connection is refused. */
  async run(): Promise<void> {
    let delay = firstDelayMs
    while (!this.#stop.aborted) {
      let detail: string
      try {
        detail = await this.#oneSession()
      } catch (error) {
        const refusal = loginRefusal(error)
        if (refusal !== null && !this.#everConnected) throw new TautlineError('kafka-login', `${refusal}.`)
        detail = topicFailure(this.#recording.kafka.topic, error)
      }
      if (this.#stop.aborted) return
      if (this.#joined) delay = firstDelayMs
      this.#joined = false
      this.#lost(detail)
      // Jitter, so that many monitors do not come back in step.
      await this.#timer.wait(delay * (0.8 + 0.4 * Math.random()), this.#stop)
      delay = Math.min(2 * delay, longestDelayMs)
    }
  }

  hold(source: string, held: boolean): void {
    for (const lane of this.#lanes.values())
      if (lane.source === source && lane.held !== held) {
        lane.held = held
        if (!held) void this.#give(lane)
      }
  }

  async commit(position: Position): Promise<void> {
    const offsets = [...this.#lanes.values()].flatMap(({ partition, source }) => {
      const offset = position[source]
      return offset !== undefined && this.#owned.has(partition) ? [{ partition, offset }] : []
    })
    if (offsets.length === 0 || this.#session === null || !this.#connected) return
    try {
      await this.#session.commit(offsets)
    } catch (error) {
      this.#context.log('debug', 'offsets could not be committed; the next checkpoint does it', {
        feed: this.#name,
        error: messageOf(error),
      })
    }
  }

  async #oneSession(): Promise<string> {
    const { topic, group, 'max-wait': maxWaitMs } = this.#recording.kafka
    await this.#settleLanes()
    const options = {
      topic,
      group,
      maxWaitMs: Math.min(longestWaitMs, Math.max(1, Math.round(maxWaitMs))),
      maxBytesPerPartition: Math.max(leastPerPartition, Math.floor(this.#perPartition / 2)),
      maxBytes: 8 * 1024 * 1024,
    }
    const session = new KafkaSession(this.#kafka, options, {
      joined: (partitions) => this.#assigned(new Set(partitions)),
      fetched: ({ batch }) => {
        const lane = this.#lanes.get(batch.partition)
        if (lane === undefined || !this.#owned.has(batch.partition)) return false
        this.#checkEnd(lane, BigInt(batch.highWatermark))
        this.#checkGap(lane, firstOffset(batch))
        lane.take(batch.messages, BigInt(batch.lastOffset()) + 1n)
        this.#setPaused(lane)
        void this.#give(lane)
        return true
      },
      passed: (partition, upTo, high) => {
        const lane = this.#lanes.get(partition)
        if (lane === undefined || !this.#owned.has(partition)) return
        lane.end = high
        lane.passTo(upTo)
        this.#tellCaughtUp(lane)
      },
      answered: () => {
        if (this.#joined) this.#found()
      },
      silent: (detail) => this.#lost(detail),
    })
    this.#session = session
    try {
      return await session.run(this.#stop, this.#timer)
    } finally {
      this.#session = null
      await session.close(this.#context.log)
    }
  }

  /** Where each partition begins; and where it goes on, should the brokers have lost what we know. */
  async #settleLanes(): Promise<void> {
    const { topic, group } = this.#recording.kafka
    const admin = this.#kafka.admin({ retry: { retries: 2 } })
    await admin.connect()
    try {
      const offsets = await offsetsOf(admin, topic, group)
      const share = Math.floor(mostWaiting / Math.max(1, offsets.length))
      this.#perPartition = Math.min(mostPerPartition, Math.max(leastPerPartition, share))
      for (const found of offsets) {
        const lane = this.#lanes.get(found.partition) ?? this.#addLane(found)
        if (lane.next < found.low && lane.isEmpty) {
          this.#checkGap(lane, found.low)
          lane.restartAt(found.low)
        }
        this.#checkEnd(lane, found.high)
      }
    } finally {
      await admin.disconnect()
    }
  }

  #addLane(found: PartitionOffsets): PartitionLane {
    const { kafka, format, limit } = this.#recording
    const source = `${kafka.topic}/${found.partition}`
    const resumed = /^[0-9]{1,19}$/.exec(this.#context.resumeAt?.[source] ?? '')?.[0]
    const from = kafka.from === 'earliest' ? found.low : found.high
    const next = resumed !== undefined ? BigInt(resumed) : (found.committed ?? from)
    const out = new BatchBuilder(this.#name, source, this.#names, this.#context.now, laneBatch)
    const reader = readerFor(format, limit, this.#names)
    const lane = new PartitionLane(source, found.partition, { next, end: found.high }, out, reader)
    this.#lanes.set(found.partition, lane)
    return lane
  }

  /** A log that ends before what was read of it was cut by its broker, or its topic was made anew. */
  #checkEnd(lane: PartitionLane, end: bigint): void {
    lane.end = end
    if (end >= lane.next) return
    const message = 'the partition ends before the place that was reached: it was cut or made anew'
    this.#tell('warn', lane, message, lane.next, end)
    lane.restartAt(end)
  }

  /** Records that are not there any more when they are asked for: kafkajs goes on at the first that is. */
  #checkGap(lane: PartitionLane, first: bigint | null): void {
    const { elsewhere, fetched } = lane
    lane.elsewhere = false
    if (elsewhere || first === null || first <= fetched) return
    const level = lane.gapTold ? 'debug' : 'warn'
    lane.gapTold = true
    this.#tell(level, lane, 'records were deleted or compacted away before they were read', fetched, first)
  }

  #assigned(now: ReadonlySet<number>): void {
    const before = this.#owned
    this.#owned = now
    this.#joined = true
    this.#found()
    const gone = [...before].filter((partition) => !now.has(partition))
    const come = [...now].filter((partition) => !before.has(partition))
    for (const partition of gone) this.#lanes.get(partition)?.clear()
    for (const partition of now) {
      const lane =
        this.#lanes.get(partition) ?? this.#addLane({ partition, low: 0n, high: 0n, committed: 0n })
      lane.elsewhere = !before.has(partition) && this.#hadBefore.has(partition)
      if (!lane.elsewhere) this.#session?.seek(partition, lane.fetched)
      this.#hadBefore.add(partition)
      lane.paused = false
      this.#session?.resume(partition)
      this.#setPaused(lane)
    }
    const sources = (partitions: readonly number[]) =>
      partitions.flatMap((partition) => this.#lanes.get(partition)?.source ?? [])
    if (gone.length > 0) this.#to.next({ type: 'revoked', sources: sources(gone) })
    if (come.length > 0) this.#to.next({ type: 'assigned', sources: sources(come) })
    for (const partition of come) this.#lanes.get(partition)!.caughtUp = false
    for (const partition of now) this.#tellCaughtUp(this.#lanes.get(partition)!)
  }

  /** Gives out what waits in a lane, batch by batch, until it is empty, held or revoked. */
  async #give(lane: PartitionLane): Promise<void> {
    if (lane.busy) return
    lane.busy = true
    try {
      // Never within the call that caused it: that may be the listener's own, in the middle of its work.
      await nextTurn()
      while (!this.#stop.aborted && !lane.held && !lane.isEmpty) {
        lane.fill()
        this.#setPaused(lane)
        const { out } = lane
        if (!out.empty) {
          const position = { [lane.source]: String(lane.next) }
          await handOver(this.#to, { ...out.given(), position, behind: lane.behind }, this.#stop)
          out.reset()
        }
        // The listener may have worked without a pause: let the network have its turn.
        await nextTurn()
      }
    } catch (error) {
      this.#to.error(error)
    } finally {
      lane.busy = false
    }
    if (lane.isEmpty) lane.passTo(lane.fetched)
    this.#tellCaughtUp(lane)
  }

  #setPaused(lane: PartitionLane): void {
    const session = this.#session
    if (session === null || !this.#owned.has(lane.partition)) return
    if (!lane.paused && lane.bytes >= this.#perPartition) {
      lane.paused = true
      session.pause(lane.partition)
    } else if (lane.paused && lane.bytes < this.#perPartition / 2) {
      lane.paused = false
      session.resume(lane.partition)
    }
  }

  #tellCaughtUp(lane: PartitionLane): void {
    if (!this.#owned.has(lane.partition) || lane.busy) return
    const now = lane.isEmpty && lane.next >= lane.end
    if (now && !lane.caughtUp) this.#to.next({ type: 'caught-up', source: lane.source })
    lane.caughtUp = now
    if (now) lane.gapTold = false
  }

  #found(): void {
    if (this.#connected) return
    this.#connected = true
    this.#everConnected = true
    this.#told = null
    this.#to.next({ type: 'connected' })
  }

  #lost(detail: string): void {
    const told = escapeText(detail)
    if (told !== this.#told)
      this.#context.log('warn', 'the Kafka feed is cut off; it tries again until it is back', {
        feed: this.#name,
        detail: told,
      })
    this.#told = told
    this.#connected = false
    this.#to.next({ type: 'disconnected', detail: told })
  }

  #tell(level: 'debug' | 'warn', lane: PartitionLane, message: string, reached: bigint, at: bigint): void {
    const fields = { source: lane.source, reached: String(reached), 'goes-on-at': String(at) }
    this.#context.log(level, message, { feed: this.#name, ...fields })
  }
}

const nextTurn = (): Promise<void> => new Promise((resolve) => setImmediate(resolve))
