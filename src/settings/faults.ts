import { z } from 'zod'
import { allowedAt, defOf, requiredKeys, written } from './allowed-words.ts'
import { nearest } from './nearest.ts'
import type { Fault, Path } from './problem.ts'
import { isExclusive, likeliest, type ObjectOption } from './variants.ts'

type Schema = z.core.$ZodType
type Kind = 'map' | 'list' | 'text' | 'number' | 'boolean' | 'nothing'

/**
 * All that is wrong with a value under a schema. Walks both together, so that of several variants only the
 * one that was most likely meant is held against the value.
 */
export function faultsOf(schema: Schema, value: unknown, path: Path = []): Fault[] {
  const def = defOf(schema)
  switch (def.type) {
    case 'object':
      return isMap(value) ? mapFaults(def.shape, value, path) : [wrong(schema, value, path)]
    case 'record':
      return isMap(value)
        ? Object.entries(value).flatMap(([key, item]) => [
            ...keyFaults(def.keyType, key, [...path, key]),
            ...faultsOf(def.valueType, item, [...path, key]),
          ])
        : [wrong(schema, value, path)]
    case 'array':
      return listFaults(schema, def.element, value, path)
    case 'union':
      return unionFaults(schema, def.options, value, path)
    default:
      return z.safeParse(schema, value).success ? [] : [wrong(schema, value, path)]
  }
}

const isMap = (value: unknown): value is Record<string, unknown> =>
  typeof value === 'object' && value !== null && !Array.isArray(value)

function kindOf(value: unknown): Kind {
  if (value === null || value === undefined) return 'nothing'
  if (Array.isArray(value)) return 'list'
  if (typeof value === 'string') return 'text'
  if (typeof value === 'number' || typeof value === 'boolean') return typeof value as 'number' | 'boolean'
  return 'map'
}

function kindsOf(schema: Schema): readonly Kind[] {
  const def = defOf(schema)
  if (def.type === 'object' || def.type === 'record') return ['map']
  if (def.type === 'array') return ['list']
  if (def.type === 'number' || def.type === 'boolean') return [def.type]
  if (def.type === 'union') return def.options.flatMap(kindsOf)
  return ['text']
}

function wrong(schema: Schema, value: unknown, path: Path): Fault {
  const kind = kindOf(value)
  const wanted = kindsOf(schema)
  const hidden = isSecret(schema)
  const words = {
    code: 'settings-wrong-value',
    path,
    at: 'value',
    allowed: allowedAt(schema),
    hidden,
  } as const
  if (kind === 'nothing') return { ...words, sentence: 'Nothing is given here.' }
  if (wanted.includes(kind))
    return {
      ...words,
      sentence: 'This value is not allowed here.',
      nearest: typeof value === 'string' && !hidden ? nearest(value, choicesOf(schema)) : null,
    }
  const quotes =
    (kind === 'number' || kind === 'boolean') && z.safeParse(schema, String(value)).success
      ? ' Put it in quotes.'
      : kind === 'text' && wanted.some((one) => one === 'number' || one === 'boolean')
        ? ' Text does not count as one; leave out the quotes.'
        : ''
  return { ...words, sentence: `This is ${kindWords[kind]}, where another kind is wanted.${quotes}` }
}

const kindWords: Readonly<Record<Kind, string>> = {
  map: 'a map',
  list: 'a list',
  text: 'text',
  number: 'a number',
  boolean: 'true or false',
  nothing: 'nothing',
}

/** A `secret` mark anywhere between the field and what is written. */
function isSecret(schema: Schema): boolean {
  for (let layer = schema; ; ) {
    if (z.globalRegistry.get(layer)?.secret === true) return true
    const inner = written(layer)
    if (inner === layer) return false
    layer = inner
  }
}

/** The words that a schema knows: literals and the entries of enumerations. */
function choicesOf(schema: Schema): string[] {
  const def = defOf(schema)
  if (def.type === 'literal') return def.values.map(String)
  if (def.type === 'enum') return Object.values(def.entries).map(String)
  if (def.type === 'union') return def.options.flatMap(choicesOf)
  return []
}

function keyFaults(keyType: Schema, key: string, path: Path): Fault[] {
  if (z.safeParse(keyType, key).success) return []
  const sentence = 'This name is not allowed here.'
  return [{ code: 'settings-wrong-value', path, at: 'key', sentence, allowed: allowedAt(keyType) }]
}

function listFaults(schema: Schema, element: Schema, value: unknown, path: Path): Fault[] {
  if (!Array.isArray(value)) return [wrong(schema, value, path)]
  const list = written(schema) as z.ZodArray
  const hasLength = list.clone({ ...list.def, element: z.unknown() }).safeParse(value).success
  const length: Fault[] = hasLength
    ? []
    : [{ ...wrong(schema, value, path), sentence: 'The list is too short or too long.' }]
  return [...length, ...value.flatMap((item, i) => faultsOf(element, item, [...path, i]))]
}

function mapFaults(shape: z.core.$ZodLooseShape, value: Record<string, unknown>, path: Path): Fault[] {
  const known = Object.keys(shape)
  const missing = new Set(requiredKeys(shape).filter((key) => !Object.hasOwn(value, key)))
  const faults: Fault[] = []
  for (const [key, item] of Object.entries(value)) {
    const inner = [...path, key]
    if (Object.hasOwn(shape, key)) {
      faults.push(...faultsOf(shape[key]!, item, inner))
      continue
    }
    const meant =
      nearest(key, missing) ??
      nearest(
        key,
        known.filter((other) => !Object.hasOwn(value, other)),
      )
    if (meant !== null) missing.delete(meant)
    faults.push(unknownKey(inner, known, meant))
  }
  for (const key of missing) faults.push(missingKey(key, shape[key]!, path))
  return faults
}

const unknownKey = (path: Path, known: readonly string[], meant: string | null): Fault => ({
  code: 'settings-unknown-key',
  path,
  at: 'key',
  sentence: 'This key is not known here.',
  allowed: known.length === 0 ? 'no keys' : known.join(', '),
  nearest: meant,
})

const missingKey = (key: string, schema: Schema, path: Path): Fault => ({
  code: 'settings-missing-key',
  path: [...path, key],
  at: 'key',
  sentence: `The key ${key} is missing.`,
  allowed: allowedAt(schema),
})

function unionFaults(schema: Schema, options: readonly Schema[], value: unknown, path: Path): Fault[] {
  if (options.some((option) => z.safeParse(option, value).success)) return []
  if (Array.isArray(value)) {
    const list = options.find((option) => defOf(option).type === 'array')
    return list ? faultsOf(list, value, path) : [wrong(schema, value, path)]
  }
  const maps = options.flatMap((option): ObjectOption[] => {
    const def = defOf(option)
    return def.type === 'object' ? [{ shape: def.shape, required: requiredKeys(def.shape) }] : []
  })
  if (!isMap(value) || maps.length === 0) return [wrong(schema, value, path)]
  const chosen = maps.length === 1 ? maps[0]! : likeliest(maps, value)
  if (chosen === null) {
    const sentence = 'What makes it one kind or another is missing.'
    return [{ code: 'settings-missing-key', path, at: 'key', sentence, allowed: allowedAt(schema) }]
  }
  return mapFaults(chosen.shape, value, path).map((fault) => amongVariants(fault, maps, chosen, path))
}

/** Words a fault of the chosen variant so that the other variants are known, too. */
function amongVariants(fault: Fault, maps: readonly ObjectOption[], chosen: ObjectOption, path: Path): Fault {
  const key = fault.path[path.length]
  if (fault.path.length !== path.length + 1 || typeof key !== 'string') return fault
  const siblings = maps.flatMap(({ shape }) => (Object.hasOwn(shape, key) ? [shape[key]!] : []))
  if (fault.code === 'settings-unknown-key' && siblings.length > 0 && isExclusive(maps)) {
    const marks = maps.map(({ required }) => required.join(' + '))
    const sentence = `This key cannot stand beside ${chosen.required.join(', ')}: one of ${marks.join(', ')} is to be chosen.`
    return { ...fault, sentence, nearest: null }
  }
  const words = siblings.flatMap((sibling) => (defOf(sibling).type === 'literal' ? choicesOf(sibling) : []))
  if (fault.code !== 'settings-wrong-value' || words.length < 2) return fault
  return { ...fault, allowed: [...new Set(words)].join(', ') }
}
