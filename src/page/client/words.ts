import type { EnsembleView, FeedView, FindingView, PageView } from '../view.ts'

/** All that the page says in words, as functions of what it is shown. Times are said in UTC. */

const two = (n: number): string => String(n).padStart(2, '0')
const months = ['Jan', 'Feb', 'Mar', 'Apr', 'May', 'Jun', 'Jul', 'Aug', 'Sep', 'Oct', 'Nov', 'Dec']

/** `10:42:05`, with the day before it unless it is the day of `beside`. */
export function clock(ms: number, beside: number | null = null): string {
  const at = new Date(ms)
  const text = `${two(at.getUTCHours())}:${two(at.getUTCMinutes())}:${two(at.getUTCSeconds())}`
  const sameDay =
    beside !== null && new Date(beside).toISOString().slice(0, 10) === at.toISOString().slice(0, 10)
  return sameDay ? text : `${at.getUTCDate()} ${months[at.getUTCMonth()]} ${at.getUTCFullYear()}, ${text}`
}

/** A span of time in its two largest units. */
export function span(ms: number): string {
  const s = Math.max(0, Math.round(ms / 1000))
  if (s < 60) return `${s} s`
  if (s < 3600) return `${Math.floor(s / 60)} min ${s % 60} s`
  if (s < 86_400) return `${Math.floor(s / 3600)} h ${Math.floor((s % 3600) / 60)} min`
  return `${Math.floor(s / 86_400)} d ${Math.floor((s % 86_400) / 3600)} h`
}

/** Three significant digits, or a dash where there is no figure. */
export const figure = (value: number | null | undefined): string =>
  value === null || value === undefined ? '–' : String(Number(value.toPrecision(3)))

export const percent = (ratio: number | null | undefined): string =>
  ratio === null || ratio === undefined
    ? '–'
    : `${(100 * ratio).toFixed(Math.abs(ratio) < 0.0995 ? 1 : 0).replace('-', '−')} %`

export const count = (n: number, one: string, many: string): string =>
  `${n.toLocaleString('en')} ${n === 1 ? one : many}`

const list = (names: readonly string[]): string =>
  names.length < 2 ? names.join('') : `${names.slice(0, -1).join(', ')} and ${names.at(-1)}`

const kinds = {
  strength: 'the same signals move together with another strength',
  partners: 'other signals move together than before',
  amplitude: 'the same partners move by other amounts',
  'one-signal': 'one signal alone moves otherwise than before',
} as const

/** `since 10:42:05 UTC, 14 min by the clock of the signals`. */
export function sinceWords({ since, time, frame }: EnsembleView): string {
  if (since === null) return frame === null ? '' : 'since before this run of the monitor began'
  const lasted = time === null ? '' : `, for ${span(time - since)}`
  return `since ${clock(since, time)} UTC${lasted}`
}

/** The one sentence on an ensemble: how it is, and what speaks for that. */
export function sentenceOf(ensemble: EnsembleView): string {
  const { state, learning, frame, evidence, shift } = ensemble
  if (frame === null) return 'No frame has been closed yet.'
  const progress = learning === null ? '' : `${learning.have} of ${learning.want} frames`
  switch (state) {
    case 'learning':
      return learning === null
        ? 'What is usual is still being learnt; no change can be called yet.'
        : `Learns what is usual: ${progress}. No change can be called yet.`
    case 'steady':
      return evidence === null
        ? 'The signals move together as in the reference.'
        : `The signals move together as in the reference; the evidence for a change is at ${percent(evidence.ratio)} of its limit.`
    case 'straining':
      return evidence === null
        ? 'Evidence for a change gathers.'
        : `Evidence for a change gathers: ${spoken(evidence.statistic)} is at ${percent(evidence.ratio)} of its limit${evidence.since === null ? '' : `, near it since ${clock(evidence.since, ensemble.time)} UTC`}.`
    case 'shifted': {
      const anew = learning === null ? '' : ` The new reference is being learnt: ${progress}.`
      if (shift === null) return `The regime has shifted.${anew}`
      const began = `began about ${clock(shift.start, ensemble.time)} UTC (between ${clock(shift.startFrom, ensemble.time)} and ${clock(shift.startTo, ensemble.time)})`
      return `Shift ${shift.number}, confirmed: ${kinds[shift.kind]}. It ${began}.${anew}`
    }
  }
}

/** A kebab-case name as words. */
export const spoken = (name: string): string => name.replaceAll('-', ' ')

/** How many signals take part, and which do not. */
export function signalsWords({ signals, missing, absent, absentCount, frame }: EnsembleView): string {
  if (frame === null) return ''
  const left = absent.map(({ signal, why }) => `${signal} (${why})`)
  if (absentCount > absent.length) left.push(`${absentCount - absent.length} more`)
  const out = absentCount === 0 ? 'none is left out' : `left out: ${list(left)}`
  const gap = missing === 0 ? '' : `; ${missing} without a value in the last frame`
  return `${count(signals, 'signal takes part', 'signals take part')}, ${out}${gap}.`
}

/** What a window of this length cannot see, in words. */
export function sightWords({ sight, window, signals }: EnsembleView): string {
  if (sight === null || window === null) return 'The sight limit is not known yet.'
  const worth = window.effective === null ? '' : `, worth ${figure(window.effective)} independent ones`
  return `With ${count(signals, 'signal', 'signals')} and a window of ${count(window.frames, 'frame', 'frames')}${worth}, a mode weaker than ${figure(sight)} times the noise cannot be seen, whatever is done.`
}

export function certificateWords({ certificate }: EnsembleView): string {
  return certificate === null
    ? 'There is no truncation certificate yet.'
    : `Clipping of extreme values can have moved the spectrum (W2) by ${figure(certificate)} at most.`
}

const models = {
  'marchenko-pastur': 'Marchenko–Pastur law',
  exponential: 'law of the exponential window',
  resampled: 'resampled signals',
} as const

export function edgeWords({ edge, escapes }: EnsembleView): string {
  if (edge === null) return 'The edge of the noise is not known yet.'
  const beyond =
    escapes.length === 0
      ? 'no mode escapes it'
      : `${count(escapes.length, 'mode escapes', 'modes escape')} it: ${list(
          escapes
            .slice(0, 5)
            .map(({ value, signals }) => `${figure(value)} shared by about ${figure(signals)} signals`),
        )}${escapes.length > 5 ? ' and weaker ones' : ''}`
  return `Noise alone reaches from ${figure(edge.lower)} to ${figure(edge.upper)} (${models[edge.model]}, fit ${figure(edge.fit)}); above ${figure(edge.limit)} is an escape at the level ${figure(edge.level)}: ${beyond}.`
}

export function distanceWords({ distance }: EnsembleView): string {
  if (distance === null) return 'The distance from the reference is not known yet.'
  return `The spectrum is ${figure(distance.w2)} from the reference (W2), under a ceiling of ${figure(distance.ceiling)}; rotation share ${figure(distance.rotation)}: near 0 the strengths have changed, near 1 the partners.`
}

/** When the last frame ended and how old the news of it is; `now` by the clock of the monitor. */
export function frameWords({ frame, time, arrived, spectrum }: EnsembleView, now: number): string {
  if (frame === null || time === null) return 'No frame yet.'
  const ago = arrived === null ? '' : `, judged ${span(now - arrived)} ago`
  const stale =
    spectrum === null || spectrum.age === 0
      ? ''
      : `; its spectrum is ${count(spectrum.age, 'frame', 'frames')} old, wrong by ${figure(spectrum.bound)} (W2) at most`
  return `Last frame: number ${frame.toLocaleString('en')}, ended ${clock(time)} UTC${ago}${stale}.`
}

/** How many ensembles are in which state, worst first, and whether a feed is away. */
export function summaryWords(view: PageView): string {
  const order = ['shifted', 'straining', 'learning', 'steady'] as const
  const parts = order.flatMap((state) => {
    const n = view.ensembles.filter((ensemble) => ensemble.state === state).length
    return n === 0 ? [] : [`${n} ${state}`]
  })
  const away = view.feeds.filter(({ connected }) => connected === false).length
  if (away > 0) parts.push(`${count(away, 'feed is', 'feeds are')} not connected`)
  return parts.length === 0 ? 'nothing is watched' : parts.join(', ')
}

export function findingWords({ signal, finding, from, to, detail }: FindingView): string {
  const lasts = to === null ? 'and lasts' : to === from ? '' : `until ${clock(to, from)} UTC`
  return `${signal ?? 'All signals'}: ${spoken(finding)} from ${clock(from)} UTC ${lasts}`
    .trim()
    .concat(detail === '' ? '.' : ` (${detail}).`)
}

/** How a feed does: connection, how far behind, what was dropped and why. */
export function feedWords({ connected, behind, readings, dropped }: FeedView): string {
  const link = connected === null ? 'not heard of yet' : connected ? 'connected' : 'not connected'
  const late = behind === null || behind === 0 ? '' : `, ${behind.toLocaleString('en')} behind`
  const drops = Object.entries(dropped)
    .filter(([, n]) => n > 0)
    .sort(([, a], [, b]) => b - a)
    .map(([reason, n]) => `${n.toLocaleString('en')} ${spoken(reason)}`)
  const lost = drops.length === 0 ? 'none dropped' : `dropped: ${drops.join(', ')}`
  return `${link}${late}; ${count(readings, 'reading', 'readings')}, ${lost}.`
}

/** JSON knows no infinity: without a figure it is played as fast as it can be. */
export const demoWords = ({
  speed,
  note,
}: {
  readonly speed: number | null
  readonly note: string
}): string =>
  `Demo, ${speed === null ? 'as fast as it goes' : `at ${figure(speed)} times real time`}. ${note}`
