import { FittedEdge } from './bulk/fitted-edge.ts'
import { Ensemble, type EnsembleSnapshot } from './ensemble.ts'
import { failed, ok, type Result, TautlineError } from './errors.ts'
import { FrameMaker, type FrameOptions } from './frames/frame-maker.ts'
import { daysOfWeek } from './frames/sessions.ts'
import { DistanceWatch, referenceInSnapshot } from './regime/distance-watch.ts'
import { type ReferenceRecord, recordOf } from './regime/reference-record.ts'
import { type Limits, type ReferenceChoice, readExplicitLimits } from './regime/watch-options.ts'
import type { EnsembleSettings } from './settings/schema.ts'
import { fastestSolver } from './spectrum/fastest-solver.ts'
import { BoxcarWindow } from './window/boxcar-window.ts'
import { ExponentialWindow } from './window/exponential-window.ts'
import { LaggedWindow } from './window/lagged-window.ts'
import { TwinWindow } from './window/twin-window.ts'
import type { Window } from './window/window.ts'

/** With `step: row` a row counts as a business day: 365 days for 261 rows. */
const rowMs = (365 / 261) * 86_400_000

/** What the settings name by file, read before: the composer itself reads nothing. */
export interface EnsembleFiles {
  readonly signals?: readonly string[]
  readonly reference?: ReferenceRecord
}

/** Composes an ensemble from its settings. Fails with `limit-unknown`. */
export function composeEnsemble(
  name: string,
  settings: EnsembleSettings,
  files: EnsembleFiles = {},
): Result<Ensemble> {
  const limits = limitsOf(settings)
  if (!limits.ok) return limits
  const solver = fastestSolver()
  const makeWindow = (): Window =>
    'frames' in settings.window
      ? new BoxcarWindow(settings.window.frames)
      : new ExponentialWindow(settings.window['half-life'])
  const window = new TwinWindow(makeWindow)
  const { span, decay } = window.cleaned
  const lagged =
    'lagged' in settings.reference ? new LaggedWindow(makeWindow(), settings.reference.lagged) : null
  const reference = referenceOf(settings, files)
  if (!reference.ok) return reference
  return ok(
    new Ensemble({
      name,
      title: settings.title ?? name,
      feeds: settings.feeds === undefined ? null : new Set(settings.feeds),
      maker: new FrameMaker(frameOptions(settings, files, span)),
      window,
      lagged,
      solver,
      bulk: new FittedEdge({ level: settings.level, decay, scale: settings.scale }, solver),
      watch: new DistanceWatch(
        {
          window: { span, decay },
          reference: reference.value,
          limits: limits.value,
          scale: settings.scale,
          planned: settings.planned.map(({ from, to, note }) => ({
            from: Date.parse(from),
            to: Date.parse(to),
            note,
          })),
        },
        solver,
      ),
      scale: settings.scale,
    }),
  )
}

/** The reference that the snapshot of an ensemble holds, for keeping as a file; null while it is learnt. */
export function referenceInState(snapshot: unknown): ReferenceRecord | null {
  const { watch, names } = snapshot as EnsembleSnapshot
  const reference = referenceInSnapshot(watch)
  return reference === null ? null : recordOf(reference, names)
}

function frameOptions(settings: EnsembleSettings, files: EnsembleFiles, span: number): FrameOptions {
  const { clock, signals, memory, scale, truncate } = settings
  const wanted = 'frames' in settings.reference ? settings.reference.frames : span
  return {
    signals: Array.isArray(signals)
      ? { names: signals }
      : 'pattern' in signals
        ? signals
        : { names: files.signals ?? [] },
    step: clock.step,
    lateness: clock.lateness,
    staleAfter: clock['stale-after'] ?? null,
    idleAfter: clock['idle-after'],
    ahead: clock.ahead,
    sessions: clock.sessions ?? null,
    increment: settings.increment,
    levelSpan: span,
    memory,
    fitOver: Math.max(60, Math.min(wanted, 400)),
    commonVolatility: settings['common-volatility'],
    truncateAt: truncate === 'off' ? null : truncate.at,
    scaleSpan: 2 * span,
    scaleFixedAfter: scale === 'covariance' ? Math.max(20, wanted) : null,
    stuckAfter: settings['stuck-after'] ?? null,
  }
}

function referenceOf(settings: EnsembleSettings, files: EnsembleFiles): Result<ReferenceChoice> {
  const { reference } = settings
  if ('from' in reference) {
    return files.reference === undefined
      ? failed(new TautlineError('reference-unreadable', `${reference.from} was not read.`))
      : ok({ from: files.reference })
  }
  if ('since' in reference) return ok({ since: Date.parse(reference.since), frames: reference.frames })
  return ok(reference)
}

function limitsOf({ limits, clock }: EnsembleSettings): Result<Limits> {
  if ('explicit' in limits) {
    const explicit = readExplicitLimits(limits.explicit)
    return explicit.ok ? ok({ explicit: explicit.value }) : explicit
  }
  const { pages, per } = limits['false-pages']
  const open = clock.sessions === undefined ? 1 : openShare(clock.sessions)
  return ok({ framesPerFalsePage: (per * open) / (clock.step === 'row' ? rowMs : clock.step) / pages })
}

/** Share of the week in which the market is open. */
function openShare({ open, close, days }: NonNullable<EnsembleSettings['clock']['sessions']>): number {
  const minutes = (text: string): number => Number(text.slice(0, 2)) * 60 + Number(text.slice(3))
  const length = (minutes(close) - minutes(open) + 1440) % 1440 || 1440
  return (length * daysOfWeek(days).size) / (7 * 1440)
}
