import type { z } from 'zod'
import type { settingsSchema } from '../src/settings/schema.ts'
import { type DemoClock, defaultClock, plantedTimes } from './demo-feed.ts'
import { deskSignals } from './desk.ts'
import { stationEvents, stationSignals } from './station.ts'

/** Frames before and after a change-over in which a change is expected. */
const plannedMargin = { before: 12, after: 120 }

/**
 * Settings for the two ensembles of the demo, in the words of the YAML file; feeds and routes are for the
 * caller to add. `rounds` as given to the generators' schedules.
 */
export function demoSettings(clock: Partial<DemoClock> = {}, rounds = 1): z.input<typeof settingsSchema> {
  const { start, stepMs, latenessMs } = { ...defaultClock, ...clock }
  const common = {
    clock: {
      step: `${stepMs}ms`,
      lateness: `${latenessMs}ms`,
      'stale-after': `${12 * stepMs}ms`,
    },
    window: { frames: 120 },
    reference: { frames: 240 },
    truncate: { at: 5 },
    limits: { 'false-pages': '1 per 90d' },
  } as const
  const planned = stationEvents(rounds)
    .filter(({ expected }) => expected === 'planned')
    .map((event) => {
      const { from } = plantedTimes(event, { start, stepMs })
      return {
        from: new Date(from - plannedMargin.before * stepMs).toISOString(),
        to: new Date(from + plannedMargin.after * stepMs).toISOString(),
        note: 'change-over of the pumps',
      }
    })
  return {
    ensembles: {
      desk: {
        title: 'Northern desk (invented)',
        signals: [...deskSignals],
        ...common,
        increment: 'log-return',
        memory: 'none',
        'common-volatility': 'remove',
      },
      station: {
        title: 'Pumping station (invented)',
        signals: [...stationSignals],
        ...common,
        increment: 'level',
        memory: 'prewhiten',
        'common-volatility': 'keep',
        planned,
      },
    },
  }
}
