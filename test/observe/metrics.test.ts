import { describe, expect, test } from 'vitest'
import { Metrics } from '../../src/observe/metrics.ts'
import { judged, learningFrame, shiftAt } from '../page/support/invented.ts'

const opened = (): Metrics => {
  const metrics = new Metrics('1.2.3')
  metrics.openFeed('ticks')
  metrics.openEnsemble('desk')
  metrics.openRoute('on-call')
  return metrics
}
/** The samples of the metrics whose name begins so, by name and labels. */
async function samples(metrics: Metrics, name: string): Promise<Record<string, number>> {
  const { body } = await metrics.text()
  const lines = body.split('\n').filter((line) => line.startsWith(`tautline_${name}`))
  return Object.fromEntries(
    lines.map((line) => [
      line.slice('tautline_'.length, line.lastIndexOf(' ')),
      Number(line.split(' ').at(-1)),
    ]),
  )
}

describe('metrics', () => {
  test('counters stand at 0 before anything has happened, so that the first rise is seen', async () => {
    const metrics = opened()
    expect(await samples(metrics, 'readings_total')).toEqual({ 'readings_total{feed="ticks"}': 0 })
    const drops = await samples(metrics, 'readings_dropped_total')
    expect(drops['readings_dropped_total{feed="ticks",reason="late"}']).toBe(0)
    expect(Object.keys(await samples(metrics, 'regime_shifts_total')).length).toBe(4)
    expect(await samples(metrics, 'alert_deliveries_total')).toEqual({
      'alert_deliveries_total{route="on-call",outcome="delivered"}': 0,
      'alert_deliveries_total{route="on-call",outcome="failed"}': 0,
      'alert_deliveries_total{route="on-call",outcome="given-up"}': 0,
    })
  })

  test('a judged frame is counted, timed in seconds, and its figures shown', async () => {
    const metrics = opened()
    const frame = judged(7, { verdict: { state: 'shifted', shift: shiftAt(7, { kind: 'partners' }) } })
    metrics.judged(frame, frame.time + 1500)
    expect(await samples(metrics, 'frame_delay_seconds_sum')).toEqual({
      'frame_delay_seconds_sum{ensemble="desk"}': 1.5,
    })
    expect(await samples(metrics, 'frame_compute_seconds_sum')).toMatchObject({
      'frame_compute_seconds_sum{ensemble="desk",step="spectrum"}': 0.0004,
    })
    expect(await samples(metrics, 'last_frame')).toEqual({
      'last_frame_timestamp_seconds{ensemble="desk"}': frame.time / 1000,
    })
    expect(await samples(metrics, 'regime_state')).toEqual({
      'regime_state{ensemble="desk",state="learning"}': 0,
      'regime_state{ensemble="desk",state="steady"}': 0,
      'regime_state{ensemble="desk",state="straining"}': 0,
      'regime_state{ensemble="desk",state="shifted"}': 1,
    })
    expect(await samples(metrics, 'regime_shifts_total{ensemble="desk",kind="partners"}')).toEqual({
      'regime_shifts_total{ensemble="desk",kind="partners"}': 1,
    })
    expect(await samples(metrics, 'bulk_edge')).toEqual({
      'bulk_edge{ensemble="desk",side="lower"}': 0.26,
      'bulk_edge{ensemble="desk",side="upper"}': 2.21,
    })
  })

  test('what is not known any more has no series, rather than its last value', async () => {
    const metrics = opened()
    metrics.judged(judged(7), 0)
    const names = [
      'escapes',
      'leading_',
      'bulk_',
      'spectral_',
      'rotation_',
      'evidence_',
      'truncation_',
      'sight_',
    ]
    for (const name of names) expect(Object.keys(await samples(metrics, name)), name).not.toEqual([])
    metrics.judged(learningFrame(8), 0)
    for (const name of names) expect(await samples(metrics, name), name).toEqual({})
  })

  test('no figure that is not finite is ever shown', async () => {
    const metrics = opened()
    metrics.judged(
      judged(7, {
        share: Number.NaN,
        certificate: Number.POSITIVE_INFINITY,
        verdict: {
          sight: Number.NaN,
          distance: { w2: Number.NaN, ceiling: Number.NaN, rotation: Number.NaN },
          statistics: { frobenius: Number.NaN, 'leading-share': 0.5 },
        },
      }),
      0,
    )
    const { body } = await metrics.text()
    expect(body).not.toMatch(/ (NaN|Nan|[+-]?Inf)$/m)
    expect(await samples(metrics, 'evidence_ratio')).toEqual({
      'evidence_ratio{ensemble="desk",statistic="leading-share"}': 0.5,
    })
  })

  test('the table of carriers names ten signals at most, and none that no longer carries', async () => {
    const metrics = opened()
    const shares = (from: number) =>
      Array.from({ length: 30 }, (_, k) => ({ signal: `S${from + k}`, share: 0.01 }))
    for (let k = 0; k < 50; k++) metrics.carriers('desk', shares(k))
    const shown = Object.keys(await samples(metrics, 'carrier_share_ratio'))
    expect(shown.length).toBe(10)
    expect(shown[0]).toBe('carrier_share_ratio{ensemble="desk",signal="S49"}')
    metrics.carriers('desk', [])
    expect(await samples(metrics, 'carrier_share_ratio')).toEqual({})
  })

  test('a name from outside stays inside its label', async () => {
    const metrics = opened()
    metrics.carriers('desk', [{ signal: 'a"} 1\ntautline_forged 1\\', share: 0.1 }])
    const { body } = await metrics.text()
    expect(body).not.toMatch(/^tautline_forged/m)
    expect(body).toContain('signal="a\\"} 1\\ntautline_forged 1\\\\"')
  })

  test('the process itself is shown under its usual names', async () => {
    const { body } = await opened().text()
    expect(body).toMatch(/^process_resident_memory_bytes \d+$/m)
    expect(body).not.toMatch(/^# TYPE nodejs_\S*_total gauge$/m)
  })
})
