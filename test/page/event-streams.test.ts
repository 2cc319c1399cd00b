import { describe, expect, it } from 'vitest'
import { EventStreams, type StreamOut, usualLimits } from '../../src/page/event-streams.ts'
import type { PageChange, PageView } from '../../src/page/view.ts'
import { emptyState } from './support/invented.ts'

/** A reader that takes what is written, or none of it. */
class Reader implements StreamOut {
  text = ''
  ended = false
  destroyed = false
  writableLength = 0
  takes = true
  write(text: string): boolean {
    if (this.takes) this.text += text
    else this.writableLength += text.length
    return this.takes
  }
  end(): void {
    this.ended = true
  }
  destroy(): void {
    this.destroyed = true
  }
  get events(): { id: string | null; event: string; data: { now: number } }[] {
    return this.text
      .split('\n\n')
      .filter((block) => block.includes('event: '))
      .map((block) => ({
        id: /^id: (.*)$/m.exec(block)?.[1] ?? null,
        event: /^event: (.*)$/m.exec(block)![1]!,
        data: JSON.parse(/^data: (.*)$/m.exec(block)![1]!),
      }))
  }
}

const view = (): PageView => emptyState().view(1)
const change = (now: number, filling = ''): PageChange => ({
  now,
  ensembles: [],
  findings:
    filling === '' ? [] : [{ ensemble: filling, signal: null, finding: 'gap', from: 0, to: 0, detail: '' }],
})
const opened = (streams: EventStreams, lastId: string | null = null): Reader => {
  const reader = new Reader()
  streams.open(reader, lastId, view)
  return reader
}

describe('the stream of events', () => {
  it('begins with the whole state and goes on with changes, each with an id', () => {
    const streams = new EventStreams('run')
    const reader = opened(streams)
    streams.publish(change(2))
    streams.publish(change(3))
    expect(reader.events.map(({ id, event, data }) => [id, event, data.now])).toEqual([
      ['run-0', 'state', 1],
      ['run-1', 'change', 2],
      ['run-2', 'change', 3],
    ])
    expect(reader.text).toMatch(/^retry: \d+\n\n/)
  })

  it('gives one that comes back what it has missed, and no more', () => {
    const streams = new EventStreams('run')
    for (let k = 1; k <= 5; k++) streams.publish(change(k))
    expect(opened(streams, 'run-3').events.map(({ data }) => data.now)).toEqual([4, 5])
    expect(opened(streams, 'run-5').events).toEqual([])
  })

  it.each(['other-3', 'run-99', 'run-', 'run-x', '', 'run-3\nevent: state', 'run-0'])(
    'gives the whole state to one that comes with %j',
    (id) => {
      const streams = new EventStreams('run', { ...usualLimits, kept: 3 })
      for (let k = 1; k <= 5; k++) streams.publish(change(k))
      expect(opened(streams, id).events.map(({ event, id }) => [event, id])).toEqual([['state', 'run-5']])
    },
  )

  it('keeps no more changes than it may, by number and by size', () => {
    const streams = new EventStreams('run', { ...usualLimits, keptCharacters: 2000 })
    for (let k = 1; k <= 100; k++) streams.publish(change(k, 'x'.repeat(500)))
    expect(opened(streams, 'run-98').events.map(({ data }) => data.now)).toEqual([99, 100])
    expect(opened(streams, 'run-90').events.map(({ event }) => event)).toEqual(['state'])
  })

  it('lets go of a reader that does not keep up, and of no other', () => {
    const streams = new EventStreams('run', { ...usualLimits, waiting: 10_000 })
    const [slow, quick] = [opened(streams), opened(streams)]
    slow.takes = false
    for (let k = 1; k <= 200; k++) streams.publish(change(k, 'x'.repeat(500)))
    expect(slow.destroyed).toBe(true)
    // The allowance, and twice the largest event, but not all that was published.
    expect(slow.writableLength).toBeLessThan(20_000)
    expect(quick.destroyed).toBe(false)
    expect(quick.events.length).toBe(201)
    expect([streams.clients, streams.letGo]).toEqual([1, 1])
  })

  it('does not let go of one that keeps up because a single event is larger than the allowance', () => {
    const streams = new EventStreams('run', { ...usualLimits, waiting: 1000 })
    const [slow, quick] = [opened(streams), opened(streams)]
    slow.takes = quick.takes = false
    for (let k = 1; k <= 4; k++) {
      streams.publish(change(k, 'x'.repeat(5000)))
      quick.writableLength = 0
    }
    expect([slow.destroyed, quick.destroyed]).toEqual([true, false])
    expect(slow.writableLength).toBeLessThan(4 * 5000)
  })

  it('beats without an id, so that a return is counted from the last change', () => {
    const streams = new EventStreams('run')
    const reader = opened(streams)
    streams.beat(42)
    expect(reader.events.at(-1)).toEqual({ id: null, event: 'beat', data: { now: 42 } })
  })

  it('forgets those who have gone, ends the others on closing, and says when it is full', () => {
    const streams = new EventStreams('run', { ...usualLimits, clients: 2 })
    const [gone, stays] = [opened(streams), opened(streams)]
    expect(streams.full).toBe(true)
    streams.gone(gone)
    expect(streams.full).toBe(false)
    streams.publish(change(1))
    expect(gone.events.length).toBe(1)
    streams.close()
    expect([gone.ended, stays.ended]).toEqual([false, true])
  })
})
