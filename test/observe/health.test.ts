import { describe, expect, test } from 'vitest'
import { Health } from '../../src/observe/health.ts'

const options = { mostBehind: 100, stallAfterMs: 5000 }

describe('health', () => {
  test('is not ready before each feed is connected and read up to the present, and says which is not', () => {
    const health = new Health(['ticks', 'station'], options)
    expect(health.ready(0).reasons).toEqual(['feed ticks is not connected', 'feed station is not connected'])
    health.connected('ticks', true)
    health.connected('station', true)
    expect(health.ready(0).reasons).toHaveLength(2)
    health.caughtUp('ticks')
    health.behind('station', 101)
    expect(health.ready(0).reasons).toEqual(['feed station is 101 behind'])
    health.behind('station', 100)
    expect(health.ready(0)).toEqual({ ok: true, reasons: [] })
  })

  test('a lost connection is told at once, and being connected again is not yet being abreast', () => {
    const health = new Health(['ticks'], options)
    health.connected('ticks', true)
    health.caughtUp('ticks')
    health.connected('ticks', false)
    expect(health.ready(0).ok).toBe(false)
    health.connected('ticks', true)
    expect(health.ready(0).ok).toBe(false)
    health.caughtUp('ticks')
    expect(health.ready(0).ok).toBe(true)
  })

  test('is alive while it gets on, and not when what it has in hand takes too long', () => {
    const health = new Health([], options)
    health.busy(1000)
    expect(health.live(6000).ok).toBe(true)
    expect(health.live(6001).reasons).toEqual(['no progress for more than 5 s'])
    expect(health.ready(6001).ok).toBe(false)
    health.busy(null)
    expect(health.live(60_000).ok).toBe(true)
  })

  test('a store that cannot be written, and stopping, are reasons not to be ready', () => {
    const health = new Health([], options)
    health.store('disk full')
    expect(health.ready(0).reasons).toEqual(['the store cannot be written: disk full'])
    health.store(null)
    health.stopping()
    expect(health.ready(0).reasons).toEqual(['stopping'])
  })
})
