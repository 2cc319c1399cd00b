import type { LearnerPlan } from './learner.ts'
import type { DrawPlan } from './limit-draws.ts'
import type { Reference } from './reference.ts'
import { windowTail } from './tail.ts'
import type { WatchOptions } from './watch-options.ts'

/**
 * Share, W2 and Frobenius distance all follow the leading mode and page together; the partner distance is
 * beside it by construction. So the budget is divided in two.
 */
const separateWatchers = 2

/** Frames that pass after the reference before the window is free of it; a lagged one is never waited for. */
export const settleOf = (options: WatchOptions): number =>
  'lagged' in options.reference ? 0 : options.window.span

/**
 * What is to be learnt. A lagged reference needs no frames of its own; with a budget its first max(T + L, 3T)
 * frames teach the limits, with explicit limits the two windows only have to fill. After a reference from a
 * file the next one has as many frames, but 2 to 4 windows' worth.
 */
export function learningPlan(
  options: WatchOptions,
  generation: number,
  given: Reference | null,
): LearnerPlan {
  const { limits, reference, seed, window } = options
  const { span, decay } = window
  // A window of an exponential memory scatters like as many equal frames as Kish's number says.
  const equal = decay === null ? span : Math.round((1 + decay) / (1 - decay))
  const turnover = decay === null ? 1 / span : -Math.log(decay)
  return {
    frames: given === null ? gathered(options) : 0,
    settle: given === null ? settleOf(options) : 0,
    since: 'since' in reference ? reference.since : Number.NEGATIVE_INFINITY,
    draws: drawPlan(options, equal, given),
    tail: 'explicit' in limits ? null : windowTail(limits.framesPerFalsePage, turnover, separateWatchers),
    scale: options.scale ?? 'correlation',
    seed: (seed ?? 1) + 7919 * generation,
  }
}

function gathered({ limits, reference, window: { span } }: WatchOptions): number {
  if ('frames' in reference) return reference.frames
  if ('from' in reference) return Math.min(4 * span, Math.max(reference.from.frames, 2 * span))
  const two = span + reference.lagged
  return 'explicit' in limits ? two : Math.max(two, 3 * span)
}

function drawPlan(options: WatchOptions, span: number, given: Reference | null): DrawPlan {
  if (given !== null) return { kind: 'normal', span, frames: given.frames }
  if ('lagged' in options.reference) return { kind: 'lagged', span, lag: options.reference.lagged }
  return { kind: 'fixed', span }
}
