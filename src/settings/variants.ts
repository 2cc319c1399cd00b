import { z } from 'zod'
import { defOf } from './allowed-words.ts'
import { nearest } from './nearest.ts'

/** One variant of several maps, such as a feed of kind `kafka`. */
export interface ObjectOption {
  readonly shape: z.core.$ZodLooseShape
  readonly required: readonly string[]
}

/** Whether every variant is marked by required keys that no other one has. */
export function isExclusive(options: readonly ObjectOption[]): boolean {
  const marks = options.flatMap(({ required }) => required)
  return new Set(marks).size === marks.length
}

/** The variant that was most likely meant, or null where no key tells; of equals the one named first. */
export function likeliest(
  options: readonly ObjectOption[],
  value: Record<string, unknown>,
): ObjectOption | null {
  let best: ObjectOption | null = null
  let most = Number.NEGATIVE_INFINITY
  const keys = Object.keys(value)
  const firstNamed = ({ required }: ObjectOption) => keys.findIndex((key) => required.includes(key))
  for (const option of [...options].sort((a, b) => firstNamed(a) - firstNamed(b))) {
    const { marks, score } = rate(option, value)
    if (marks > 0 && score > most) {
      best = option
      most = score
    }
  }
  return best
}

function rate({ shape, required }: ObjectOption, value: Record<string, unknown>) {
  const keys = Object.keys(value)
  let marks = 0
  let score = 0
  for (const key of required) {
    if (Object.hasOwn(value, key)) {
      marks++
      score += 3
      if (defOf(shape[key]!).type === 'literal')
        score += z.safeParse(shape[key]!, value[key]).success ? 10 : -4
    } else if (
      nearest(
        key,
        keys.filter((other) => !Object.hasOwn(shape, other)),
      ) !== null
    ) {
      marks++
      score += 2
    } else score -= 1
  }
  return { marks, score: score - 2 * keys.filter((key) => !Object.hasOwn(shape, key)).length }
}
