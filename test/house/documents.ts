import { z } from 'zod'
import { errorCatalogue } from '../../src/errors.ts'
import { dropReasons } from '../../src/reasons.ts'
import { allowedAt, defOf, requiredKeys } from '../../src/settings/allowed-words.ts'
import { settingsSchema } from '../../src/settings/schema.ts'
import { isExclusive, type ObjectOption } from '../../src/settings/variants.ts'

/** Tables of the README that are made from the source, by the name of their markers. */
const tables: Readonly<Record<string, () => string>> = {
  settings: settingsTable,
  errors: () =>
    table(
      ['code', 'what is wrong', 'what to do'],
      Object.entries(errorCatalogue).map(([code, { sentence, remedy }]) => [`\`${code}\``, sentence, remedy]),
    ),
  'drop-reasons': () =>
    table(
      ['reason', 'meaning'],
      Object.entries(dropReasons).map(([reason, meaning]) => [`\`${reason}\``, meaning]),
    ),
}

/** The text with what stands between `<!-- begin NAME -->` and `<!-- end NAME -->` made anew. Throws where a pair is missing. */
export function withTables(text: string): string {
  let written = text
  for (const [name, make] of Object.entries(tables)) {
    const [begin, end] = [`<!-- begin ${name} -->`, `<!-- end ${name} -->`]
    const [from, to] = [written.indexOf(begin), written.indexOf(end)]
    if (from < 0 || to < from) throw new Error(`README.md lacks ${begin} … ${end}`)
    written = `${written.slice(0, from + begin.length)}\n${make()}\n${written.slice(to)}`
  }
  return written
}

const cell = (text: string) => text.replaceAll('|', '\\|').replaceAll('\n', ' ')

const table = (head: readonly string[], rows: readonly (readonly string[])[]): string =>
  [head, head.map(() => '---'), ...rows].map((row) => `| ${row.map(cell).join(' | ')} |`).join('\n')

interface Row {
  readonly key: string
  readonly allowed: string
  readonly initial: string
  readonly meaning: string
}

function settingsTable(): string {
  const seen = new Set<string>()
  // A Kafka connection is described once, under the feeds.
  const rows = rowsOf(settingsSchema, '').filter(({ key, meaning }) => {
    const mark = `${key.replace(/^(feeds|routes)\.NAME\.kafka\./, '')} ${meaning}`
    return !seen.has(mark) && seen.add(mark)
  })
  return table(
    ['key', 'what may stand there', 'default', 'meaning'],
    rows.map(({ key, allowed, initial, meaning }) => [`\`${key}\``, allowed, initial, meaning]),
  )
}

/** One row a key, in the order of the schema; several variants of a map one after the other. */
function rowsOf(schema: z.core.$ZodType, path: string): Row[] {
  const def = defOf(schema)
  if (def.type === 'record') return rowsOf(def.valueType, `${path}.NAME`)
  if (def.type === 'array') return rowsOf(def.element, `${path}[]`)
  if (def.type === 'union') return variantRows(def.options, path)
  if (def.type !== 'object') return []
  return Object.entries(def.shape).flatMap(([key, child]) => {
    const inner = path === '' ? key : `${path}.${key}`
    return [
      {
        key: inner,
        allowed: allowedInShort(child),
        initial: initialOf(child),
        meaning: jsonOf(child).description ?? '',
      },
      ...rowsOf(child, inner),
    ]
  })
}

function variantRows(options: readonly z.core.$ZodType[], path: string): Row[] {
  const maps = options.flatMap((option): ObjectOption[] => {
    const def = defOf(option)
    return def.type === 'object' ? [{ shape: def.shape, required: requiredKeys(def.shape) }] : []
  })
  const isChoice = maps.length > 1 && isExclusive(maps)
  return options.flatMap((option) =>
    rowsOf(option, path).map((row) => {
      const def = defOf(option)
      const own = row.key.slice(path.length + 1)
      const isMark = isChoice && def.type === 'object' && requiredKeys(def.shape).includes(own)
      const [literal] =
        def.type === 'object'
          ? Object.entries(def.shape).flatMap(([key, child]) =>
              defOf(child).type === 'literal' ? [`${key}: ${allowedAt(child)}`] : [],
            )
          : []
      const among = literal === undefined || literal.startsWith(`${own}:`) ? '' : `With \`${literal}\`: `
      return { ...row, initial: isMark ? '*choose one*' : row.initial, meaning: among + row.meaning }
    }),
  )
}

const allowedInShort = (schema: z.core.$ZodType): string =>
  allowedAt(schema)
    .replaceAll('text of 1 to 1000 characters', 'text')
    .replaceAll(/a duration such as [^,]+(, [^,]+)* or 90d/g, 'a duration')
    .replaceAll(/, such as [^,]+( or \S+)?$/g, '')
    .replace(' without a user name or password in it', '')

const jsonOf = (schema: z.core.$ZodType) =>
  z.toJSONSchema(schema, { io: 'input', unrepresentable: 'any' }) as {
    default?: unknown
    description?: string
  }

function initialOf(schema: z.core.$ZodType): string {
  if (!z.safeParse(schema, undefined).success) return '**needed**'
  const { default: initial } = jsonOf(schema)
  if (initial === undefined || (typeof initial === 'object' && JSON.stringify(initial) === '{}')) return ''
  return `\`${typeof initial === 'string' ? initial : JSON.stringify(initial).replaceAll('"', '').replaceAll(':', ': ')}\``
}
