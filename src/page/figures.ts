/** A figure as the page is shown it: so many significant digits; null where it is not finite. */
export const figure = (value: number | null | undefined, digits = 6): number | null =>
  typeof value === 'number' && Number.isFinite(value) ? Number(value.toPrecision(digits)) : null
