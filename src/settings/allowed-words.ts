import { z } from 'zod'
import { allowedWords } from './scalars.ts'

/** The zod schema behind `optional`, `default`, `prefault` and transforms: what the user writes. */
export function written(schema: z.core.$ZodType): z.core.$ZodType {
  let inner = schema
  for (;;) {
    const { def } = (inner as z.core.$ZodTypes)._zod
    if (def.type === 'optional' || def.type === 'default' || def.type === 'prefault') inner = def.innerType
    else if (def.type === 'pipe') inner = def.in
    else return inner
  }
}

export const defOf = (schema: z.core.$ZodType) => (written(schema) as z.core.$ZodTypes)._zod.def

/** Keys of a map that must be given. */
export const requiredKeys = (shape: z.core.$ZodLooseShape): string[] =>
  Object.keys(shape).filter((key) => !z.safeParse(shape[key]!, undefined).success)

/** What may stand at a place, in words: `a whole number from 8 to 1000000`, `row, or a duration such as 5s`. */
export function allowedAt(schema: z.core.$ZodType): string {
  for (let layer = schema; ; ) {
    const words = allowedWords.get(layer)?.allowed
    if (words !== undefined) return words
    const { def } = (layer as z.core.$ZodTypes)._zod
    if (def.type === 'optional' || def.type === 'default' || def.type === 'prefault') layer = def.innerType
    else if (def.type === 'pipe') layer = def.in
    else break
  }
  const def = defOf(schema)
  switch (def.type) {
    case 'literal':
      return def.values.map(String).join(', ')
    case 'enum':
      return Object.values(def.entries).map(String).join(', ')
    case 'boolean':
      return 'true, false'
    case 'number':
      return numberWords(written(schema))
    case 'string':
      return stringWords(written(schema))
    case 'array':
      return listWords(written(schema), def.element)
    case 'record':
      return 'a map'
    case 'object':
      return mapWords([def.shape])
    case 'union':
      return unionWords(def.options)
    default:
      return def.type
  }
}

interface Limits {
  readonly type?: string
  readonly minimum?: number
  readonly maximum?: number
  readonly exclusiveMinimum?: number
  readonly minLength?: number
  readonly maxLength?: number
  readonly minItems?: number
  readonly maxItems?: number
  readonly format?: string
}

const limitsOf = (schema: z.core.$ZodType): Limits =>
  z.toJSONSchema(schema, { io: 'input', unrepresentable: 'any' }) as Limits

function numberWords(schema: z.core.$ZodType): string {
  const { type, minimum, maximum, exclusiveMinimum } = limitsOf(schema)
  const kind = type === 'integer' ? 'a whole number' : 'a number'
  if (exclusiveMinimum !== undefined) return `${kind} above ${exclusiveMinimum}`
  return minimum !== undefined && maximum !== undefined ? `${kind} from ${minimum} to ${maximum}` : kind
}

function stringWords(schema: z.core.$ZodType): string {
  const { format, maxLength } = limitsOf(schema)
  if (format === 'date') return 'a date such as 2026-11-02'
  if (format === 'date-time') return 'a time with its offset, such as 2026-11-02T09:00:00+01:00'
  return maxLength === undefined ? 'text' : `text of 1 to ${maxLength} characters`
}

function listWords(schema: z.core.$ZodType, element: z.core.$ZodType): string {
  const { minItems, maxItems } = limitsOf(schema)
  const least = minItems === undefined ? '' : ` of at least ${minItems}`
  const most = maxItems === undefined ? '' : `${least === '' ? ' of' : ' and'} at most ${maxItems}`
  return `a list${least}${most}, each ${allowedAt(element)}`
}

function mapWords(shapes: readonly z.core.$ZodLooseShape[]): string {
  const [only] = shapes
  if (shapes.length > 1) {
    const marks = shapes.map((shape) => requiredKeys(shape).join(' + '))
    return `a map with one of ${marks.join(', ')}`
  }
  if (only === undefined || Object.keys(only).length === 0) return '{} (an empty map)'
  const required = requiredKeys(only)
  return `a map with ${(required.length > 0 ? required : Object.keys(only)).join(', ')}`
}

function unionWords(options: readonly z.core.$ZodType[]): string {
  const shapes: z.core.$ZodLooseShape[] = []
  const others: string[] = []
  for (const option of options) {
    const def = defOf(option)
    if (def.type === 'object') shapes.push(def.shape)
    else others.push(allowedAt(option))
  }
  return [...others, ...(shapes.length > 0 ? [mapWords(shapes)] : [])].join(', or ')
}
