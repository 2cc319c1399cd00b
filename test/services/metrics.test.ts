import { readFile } from 'node:fs/promises'
import { expect, inject, test } from 'vitest'
import { parse } from 'yaml'
import { freePort, until } from '../support/host.ts'
import { PrometheusProcess, promtool } from './support/prometheus.ts'
import { Tautline } from './support/tautline.ts'

/** Names that the project's own table of names promises. */
const promised = [
  'readings_total',
  'readings_dropped_total',
  'frames_total',
  'frame_delay_seconds',
  'frame_compute_seconds',
  'last_frame_timestamp_seconds',
  'feed_behind_messages',
  'signals',
  'window_frames',
  'leading_eigenvalue_share_ratio',
  'bulk_edge',
  'bulk_fit_distance',
  'escapes',
  'spectral_distance',
  'spectral_distance_ceiling',
  'rotation_share_ratio',
  'evidence_ratio',
  'truncation_certificate',
  'sight_limit',
  'regime_state',
  'regime_shifts_total',
  'alerts_waiting',
  'alert_deliveries_total',
  'checkpoint_age_seconds',
  'build_info',
]

test('the metrics of a running monitor pass promtool, hold what is promised, and reach Prometheus', async () => {
  const port = await freePort()
  const demo = new Tautline(['demo', '--speed', '2000', '--port', String(port)])
  try {
    const page = await demo.page()
    let text = ''
    await until('a judged distance', async () => {
      text = await (await fetch(`${page}metrics`)).text()
      return /^tautline_spectral_distance\{ensemble="desk"\} /m.test(text)
    })
    expect(await promtool(inject('prometheus'), ['check', 'metrics'], text)).toEqual({
      code: 0,
      stdout: '',
      stderr: '',
    })
    for (const name of promised) expect(text, name).toContain(`# TYPE tautline_${name} `)
    expect(text).not.toMatch(/ (NaN|Nan|Inf|\+Inf|-Inf)$/m)
    const signalLabels = new Set(
      [...text.matchAll(/carrier_share_ratio\{ensemble="desk",signal="([^"]+)"\}/g)].map(([, name]) => name),
    )
    expect(signalLabels.size).toBeLessThanOrEqual(10)

    const prometheus = await PrometheusProcess.start(inject('prometheus'), {
      config: `scrape_configs: [{ job_name: tautline, scrape_interval: 500ms, static_configs: [{ targets: ["127.0.0.1:${port}"] }] }]`,
    })
    try {
      await until('a scrape', async () =>
        JSON.stringify(await prometheus.query('tautline_frames_total{ensemble="desk"} > 0')).includes('desk'),
      )
    } finally {
      await prometheus.dispose()
    }
  } finally {
    await demo.stop()
  }
})

test('the shipped rules ask only for metrics and label values that exist', async () => {
  const rules = parse(
    await readFile(new URL('../../config/prometheus/tautline.rules.yml', import.meta.url), 'utf8'),
  )
  const expressions = JSON.stringify(rules)
  const asked = new Set([...expressions.matchAll(/tautline_([a-z_]+)/g)].map(([, name]) => name!))
  for (const name of asked) expect(promised, name).toContain(name.replace(/_(bucket|sum|count)$/, ''))
  for (const [, values] of expressions.matchAll(/condition=~?\\+"([^"\\]+)/g)) {
    for (const value of values!.split('|'))
      expect(['well', 'missing', 'stuck', 'stale', 'clipped']).toContain(value)
  }
})
