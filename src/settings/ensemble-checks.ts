import { nearest } from './nearest.ts'
import type { Fault, Path } from './problem.ts'
import { parseDays } from './scalars.ts'
import type { ClockSettings, EnsembleSettings, SessionSettings } from './schema.ts'

/** Statistics that `limits.explicit` may name; those of the decision behind `regime/`. */
export const limitNames = ['leading-share', 'spectral-distance', 'frobenius', 'partner-distance'] as const

/** Most frames that may be open at once for late readings. */
const mostOpenFrames = 10_000

const conflict = (path: Path, sentence: string, allowed?: string): Fault => ({
  code: 'settings-conflict',
  path,
  at: 'value',
  sentence,
  ...(allowed === undefined ? {} : { allowed }),
})

const warning = (path: Path, sentence: string): Fault => ({
  ...conflict(path, sentence),
  at: 'key',
  severity: 'warning',
})

/** A name that refers to an entry of `known`. */
export function reference(path: Path, name: string, known: readonly string[], what: string): Fault[] {
  if (known.includes(name)) return []
  return [
    {
      code: 'settings-unknown-name',
      path,
      at: 'value',
      sentence: `There is no ${what} of this name.`,
      allowed: known.length > 0 ? known.join(', ') : `no names: no ${what} is set`,
      nearest: nearest(name, known),
    },
  ]
}

/** What zod cannot see within one ensemble: names, order of times, sizes that do not go together. */
export function ensembleFaults(name: string, ensemble: EnsembleSettings, feeds: readonly string[]): Fault[] {
  const path: Path = ['ensembles', name]
  return [
    ...(ensemble.feeds ?? []).flatMap((feed, i) => reference([...path, 'feeds', i], feed, feeds, 'feed')),
    ...signalFaults(ensemble, path),
    ...clockFaults(ensemble.clock, [...path, 'clock']),
    ...plannedFaults(ensemble, [...path, 'planned']),
    ...limitFaults(ensemble, [...path, 'limits']),
    ...sizeWarnings(ensemble, path),
  ]
}

function signalFaults({ signals }: EnsembleSettings, path: Path): Fault[] {
  if (!Array.isArray(signals)) return []
  const first = new Map<string, number>()
  return signals.flatMap((signal: string, i: number) => {
    const before = first.get(signal)
    if (before === undefined) {
      first.set(signal, i)
      return []
    }
    return [conflict([...path, 'signals', i], `This signal is also number ${before + 1} of the list.`)]
  })
}

function clockFaults(clock: ClockSettings, path: Path): Fault[] {
  const { step, lateness } = clock
  const stale = clock['stale-after']
  const faults: Fault[] = clock.sessions ? sessionFaults(clock.sessions, [...path, 'sessions']) : []
  if (step === 'row') return faults
  if (step <= 0) return [...faults, conflict([...path, 'step'], 'A frame must last longer than nothing.')]
  if (stale !== undefined && stale < step)
    faults.push(
      conflict(
        [...path, 'stale-after'],
        'A value would be stale before its frame is over.',
        'at least one step',
      ),
    )
  if (stale !== undefined && stale > mostOpenFrames * step)
    faults.push(
      conflict(
        [...path, 'stale-after'],
        'A silence would make so many frames of values long gone.',
        `at most ${mostOpenFrames} steps`,
      ),
    )
  if (lateness > mostOpenFrames * step)
    faults.push(
      conflict(
        [...path, 'lateness'],
        'Too many frames would be open at once.',
        `at most ${mostOpenFrames} steps`,
      ),
    )
  else if (lateness > 100 * step)
    faults.push(
      warning([...path, 'lateness'], 'Every verdict comes more than 100 frames after what it speaks of.'),
    )
  return faults
}

function sessionFaults(sessions: SessionSettings, path: Path): Fault[] {
  const faults: Fault[] = []
  if (!isZone(sessions.zone))
    faults.push({
      ...conflict(
        [...path, 'zone'],
        'There is no time zone of this name.',
        'an IANA name such as Europe/Oslo',
      ),
      code: 'settings-unknown-name',
      nearest: nearest(sessions.zone, Intl.supportedValuesOf('timeZone')),
    })
  if (sessions.open === sessions.close)
    faults.push(conflict([...path, 'close'], 'The market closes when it opens.', 'another time than `open`'))
  if (parseDays(sessions.days) === null)
    faults.push({
      ...conflict(
        [...path, 'days'],
        'These are no days of the week.',
        'a span such as mon-fri, or a list such as mon,wed,fri',
      ),
      code: 'settings-wrong-value',
    })
  return faults
}

function isZone(zone: string): boolean {
  // An offset such as +01:00 is taken by some engines; it has no daylight saving and is not what is meant.
  if (!/^[A-Za-z]/.test(zone)) return false
  try {
    new Intl.DateTimeFormat('en', { timeZone: zone })
    return true
  } catch {
    return false
  }
}

const plannedFaults = ({ planned }: EnsembleSettings, path: Path): Fault[] =>
  planned.flatMap(({ from, to }, i) =>
    Date.parse(from) < Date.parse(to)
      ? []
      : [conflict([...path, i, 'to'], 'The change ends before it begins.', `a time after ${from}`)],
  )

function limitFaults({ limits }: EnsembleSettings, path: Path): Fault[] {
  if ('explicit' in limits)
    return Object.keys(limits.explicit).flatMap((statistic): Fault[] =>
      (limitNames as readonly string[]).includes(statistic)
        ? []
        : [
            {
              ...conflict([...path, 'explicit', statistic], 'There is no statistic of this name.'),
              at: 'key',
              code: 'settings-unknown-name',
              allowed: limitNames.join(', '),
              nearest: nearest(statistic, limitNames),
            },
          ],
    )
  const { pages, per } = limits['false-pages']
  return pages > 0 && per > 0
    ? []
    : [
        conflict(
          [...path, 'false-pages'],
          'The budget must allow some pages in some time.',
          'a budget such as "1 per 90d"',
        ),
      ]
}

/** Frames that an exponential memory is worth: (1 + a)/(1 − a), a = 2^(−1/h); by 1/Σw² of its weights. */
function effectiveFrames(halfLife: number): number {
  const a = 2 ** (-1 / halfLife)
  return (1 + a) / (1 - a)
}

function sizeWarnings(ensemble: EnsembleSettings, path: Path): Fault[] {
  const { signals, window, reference: base } = ensemble
  const faults: Fault[] = []
  const frames = 'frames' in window ? window.frames : Math.round(effectiveFrames(window['half-life']))
  if (Array.isArray(signals) && frames < signals.length) {
    // Sight limit 1 + √(N/T): Baik, Ben Arous & Péché 2005.
    const sight = 1 + Math.sqrt(signals.length / frames)
    faults.push(
      warning(
        [...path, 'window'],
        `${frames} frames for ${signals.length} signals: a mode weaker than ${sight.toFixed(1)} times the noise cannot be seen.`,
      ),
    )
  }
  if ('frames' in base && base.frames < frames)
    faults.push(
      warning([...path, 'reference'], 'The reference is shorter than the window and so the noisier.'),
    )
  if (ensemble.scale === 'covariance' && ensemble['common-volatility'] === 'remove')
    faults.push(
      warning(
        [...path, 'scale'],
        'With `common-volatility: remove`, changes of amplitude that all signals share are not seen.',
      ),
    )
  return faults
}
