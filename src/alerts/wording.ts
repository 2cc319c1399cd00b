import type { Carrier, Shift } from '../regime/regime.ts'
import { rfc3339 } from './times.ts'

/** Shown with every alert, after the page of the method. */
export const cautions: readonly string[] = [
  'Correlation is not cause: the monitor sees that signals move together differently, not why.',
  'This is advice to a trained person. It is no safety function and replaces no protection layer, no alarm that a code requires and no licensed judgement.',
  'It is no investment advice.',
]

/** Shown with every heartbeat. */
export const quietCaution =
  'A quiet monitor is no evidence of a safe plant; a missing heartbeat means that nobody is watching.'

/** One plain sentence: what changed, since when, who carries it; and, once it has ended, since when it is steady. */
export function sentenceOf(title: string, shift: Shift, ended: number | null): string {
  const start = rfc3339(shift.start)
  const change = whatChanged(shift, ended !== null)
  const rest = `${shareMovement(shift)}${whoCarries(shift, ended !== null)}`
  return ended === null
    ? `${plain(title)}: ${change} since ${start}${rest}.`
    : `${plain(title)} has been steady again since ${rfc3339(ended)}; from ${start} on, ${change}${rest}.`
}

/** The numbers behind the sentence, line by line. */
export function detailsOf(shift: Shift): readonly string[] {
  const { distance, evidence } = shift
  return [
    `Shift ${shift.number}, confirmed ${rfc3339(shift.confirmed)}; it began between ${rfc3339(shift.startFrom)} and ${rfc3339(shift.startTo)}.`,
    `Share of the leading mode: ${figure(shift.shareBefore)} before, ${figure(shift.shareAfter)} after.`,
    `Distance between the spectra (W2): ${figure(distance.w2)}, under its ceiling of ${figure(distance.ceiling)}; rotation share ${figure(distance.rotation)} (near 0 the strengths changed, near 1 the partners).`,
    `Evidence: ${evidence.statistic} at ${figure(evidence.value)} against its limit of ${figure(evidence.limit)} (${figure(evidence.ratio)} times the limit).`,
    shift.certificate === null
      ? 'Truncation certificate: none, since no value was truncated.'
      : `Truncation certificate: ${figure(shift.certificate)}; clipping extreme values moved the spectrum (W2) by no more than this.`,
    `Sight limit: ${figure(shift.sight)} times the noise; a mode weaker than this cannot be seen in a window of this length.`,
    carriersLine(shift),
    likenessLine(shift),
  ]
}

/** `QUAY 0.06, MAST 0.05, …`: the largest carriers with their shares. */
export const carriersText = (shift: Shift, count = 10): string =>
  largest(shift.carriers, count)
    .map(({ signal, share }) => `${plain(signal)} ${figure(share)}`)
    .join(', ')

/** The largest carriers first, by the size of their share. */
export const largest = (carriers: readonly Carrier[], count: number): readonly Carrier[] =>
  [...carriers].sort((a, b) => Math.abs(b.share) - Math.abs(a.share)).slice(0, count)

function whatChanged(shift: Shift, past: boolean): string {
  const have = past ? 'had' : 'have'
  switch (shift.kind) {
    case 'strength': {
      const how = compare(shift.shareBefore, shift.shareAfter, 'more strongly', 'more weakly')
      return `the same signals ${have} moved together ${how ?? 'with another strength'}`
    }
    case 'partners':
      return `other signals ${have} moved together than before`
    case 'amplitude': {
      const how = compare(
        total(shift.spectrumBefore),
        total(shift.spectrumAfter),
        'more widely',
        'less widely',
      )
      return `the same partners ${have} moved ${how ?? 'by other amounts'}`
    }
    case 'one-signal': {
      const name = largest(shift.carriers, 1)[0]?.signal
      const who = name === undefined ? 'one signal' : plain(name)
      return `${who} alone ${past ? 'had' : 'has'} moved otherwise than before`
    }
  }
}

function shareMovement({ kind, shareBefore, shareAfter }: Shift): string {
  if (kind !== 'strength') return ''
  const way = compare(shareBefore, shareAfter, 'rose', 'fell')
  if (way === null) return ''
  const whole = [shareBefore, shareAfter].map((share) => (100 * share).toFixed(0))
  const [from, to] =
    whole[0] === whole[1] ? [shareBefore, shareAfter].map((share) => (100 * share).toFixed(2)) : whole
  return ` (the share of the leading mode ${way} from ${from} % to ${to} %)`
}

function whoCarries(shift: Shift, past: boolean): string {
  if (shift.kind === 'one-signal') return ''
  const first = largest(
    shift.carriers.filter(({ share }) => share > 0),
    3,
  )
  if (first.length === 0) return `; no signal ${past ? 'stood' : 'stands'} out as its carrier`
  const names = list(first.map(({ signal }) => plain(signal)))
  const part = first.reduce((sum, { share }) => sum + share, 0)
  const carry = past ? 'carried' : first.length === 1 ? 'carries' : 'carry'
  return part > 0.5 ? `; ${names} ${carry} most of it` : `; ${names} ${carry} the largest parts of it`
}

function carriersLine(shift: Shift): string {
  if (shift.carriers.length === 0) return 'Carriers: none stands out.'
  return `Carriers, with their shares: ${carriersText(shift)}; remainder ${figure(shift.remainder)}.`
}

function likenessLine({ likeness }: Shift): string {
  if (likeness.length === 0) return 'Likeness: there is no earlier regime to compare with.'
  const most = likeness.slice(0, 3).map((like) => `regime ${like.regime} (${figure(like.likeness)})`)
  return `Likeness to earlier regimes, 1 being the same: ${list(most)}.`
}

const total = (spectrum: readonly number[]): number => spectrum.reduce((sum, value) => sum + value, 0)

/** `up` or `down`, or null where the two are equal or one is not a number. */
const compare = (before: number, after: number, up: string, down: string): string | null =>
  after > before ? up : after < before ? down : null

const list = (names: readonly string[]): string =>
  names.length < 2 ? names.join('') : `${names.slice(0, -1).join(', ')} and ${names.at(-1)}`

/** Three significant digits; never NaN or Infinity. */
const figure = (value: number): string =>
  Number.isFinite(value) ? String(Number(value.toPrecision(3))) : 'not known'

/** A name from outside without control and direction characters (Unicode Cc, Cf), cut at 80 characters. */
function plain(name: string): string {
  const printable = name.replaceAll(/[\p{Cc}\p{Cf}\u2028\u2029]/gu, '')
  return printable.length > 80 ? `${printable.slice(0, 79)}…` : printable
}
