/** The steps of an RFC 6901 pointer, unescaped; the empty pointer has none and points at the whole. */
export const pointerSteps = (pointer: string): readonly string[] =>
  pointer === ''
    ? []
    : pointer
        .slice(1)
        .split('/')
        .map((step) => step.replaceAll('~1', '/').replaceAll('~0', '~'))

const arrayIndex = /^(?:0|[1-9][0-9]{0,9})$/

/** What the steps lead to inside a parsed JSON value, own members only; undefined where there is nothing. */
export function pointAt(whole: unknown, steps: readonly string[]): unknown {
  let value = whole
  for (const step of steps) {
    if (typeof value !== 'object' || value === null) return undefined
    if (Array.isArray(value)) {
      if (!arrayIndex.test(step)) return undefined
      value = value[Number(step)]
    } else {
      if (!Object.hasOwn(value, step)) return undefined
      value = (value as Record<string, unknown>)[step]
    }
  }
  return value
}
