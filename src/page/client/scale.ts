/** Where values come to lie in a drawing `height` high, the largest at the top. */
export interface Scale {
  readonly low: number
  readonly high: number
  at(value: number): number
}

const room = 0.04

/** From `low` to at least `least`, and beyond the largest of the values. */
export function linearScale(
  values: readonly (number | null)[],
  { low, least, height }: { readonly low: number; readonly least: number; readonly height: number },
): Scale {
  const high = niceAbove(values.reduce<number>((most, v) => (v === null ? most : Math.max(most, v)), least))
  return { low, high, at: (value) => place((value - low) / (high - low), height) }
}

/** Equal ratios are equally far apart; takes positive values alone. */
export function ratioScale(
  values: readonly (number | null)[],
  { least, height }: { readonly least: readonly [number, number]; readonly height: number },
): Scale {
  const known = values.filter((v): v is number => v !== null && v > 0)
  const low = niceBelow(Math.min(least[0], ...known))
  const high = niceAbove(Math.max(least[1], ...known))
  const span = Math.log(high / low)
  return { low, high, at: (value) => place(Math.log(Math.max(value, low) / low) / span, height) }
}

const place = (part: number, height: number): number =>
  height * (1 - room - (1 - 2 * room) * Math.min(1, Math.max(0, part)))

const steps = [1, 1.2, 1.5, 2, 2.5, 3, 4, 5, 6, 8, 10]

/** The next of 1, 1.2, 1.5, 2, 2.5, 3, 4, 5, 6, 8 times a power of ten; 1 where there is none. */
export function niceAbove(value: number): number {
  if (!(value > 0)) return 1
  const ten = 10 ** Math.floor(Math.log10(value))
  const step = steps.find((s) => s * ten >= value * (1 - 1e-9)) ?? 10
  return Number((step * ten).toPrecision(3))
}

/** The one before. */
export function niceBelow(value: number): number {
  if (!(value > 0)) return 1
  const ten = 10 ** Math.floor(Math.log10(value))
  const step = steps.findLast((s) => s * ten <= value * (1 + 1e-9)) ?? 1
  return Number((step * ten).toPrecision(3))
}

const short = (n: number): string => n.toFixed(1).replace(/\.0$/, '')

/** Path through the values that breaks where one is missing; a value alone becomes a dot-long dash. */
export function linePath(values: readonly (number | null)[], scale: Scale, width: number): string {
  const step = values.length > 1 ? width / (values.length - 1) : 0
  let path = ''
  let isDown = false
  for (const [i, value] of values.entries()) {
    if (value === null) {
      isDown = false
      continue
    }
    path += `${isDown ? 'L' : 'M'}${short(i * step)} ${short(scale.at(value))}`
    if (!isDown && (values[i + 1] ?? null) === null) path += 'h1'
    isDown = true
  }
  return path
}

/** As `linePath`, each value held until the next. */
export function stepPath(values: readonly (number | null)[], scale: Scale, width: number): string {
  const step = values.length > 1 ? width / (values.length - 1) : 0
  let path = ''
  let isDown = false
  for (const [i, value] of values.entries()) {
    if (value === null) {
      isDown = false
      continue
    }
    const [x, y] = [short(i * step), short(scale.at(value))]
    path += isDown ? `H${x}V${y}` : `M${x} ${y}`
    isDown = true
  }
  return path
}

/** The area between the values and the foot of the drawing. */
export function areaPath(
  values: readonly (number | null)[],
  scale: Scale,
  width: number,
  height: number,
): string {
  const step = values.length > 1 ? width / (values.length - 1) : 0
  let path = ''
  let from = -1
  for (let i = 0; i <= values.length; i++) {
    const value = values[i] ?? null
    if (value !== null) {
      if (from < 0) path += `M${short(i * step)} ${height}`
      if (from < 0) from = i
      path += `L${short(i * step)} ${short(scale.at(value))}`
    } else if (from >= 0) {
      path += `L${short((i - 1) * step)} ${height}Z`
      from = -1
    }
  }
  return path
}
