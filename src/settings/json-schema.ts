import { z } from 'zod'
import { settingsSchema } from './schema.ts'

/** Where the schema is published with the package; an identifier, not an address to fetch. */
const settingsSchemaId = 'urn:tautline:settings:1'

const placeholder = '\\$\\{[A-Za-z_][A-Za-z0-9_]*\\}'

/**
 * JSON Schema (draft 2020-12) of the settings file, from the same source as the checks. A text with
 * `${NAME}` in it is allowed wherever a text is, since its value is known only at the start.
 */
export function settingsJsonSchema(): Record<string, unknown> {
  const schema = z.toJSONSchema(settingsSchema, {
    io: 'input',
    override: ({ zodSchema, jsonSchema, path }) => {
      const node = jsonSchema as Record<string, unknown>
      // zod leaves examples out where a transform stands behind them.
      const { examples } = z.globalRegistry.get(zodSchema) ?? {}
      if (examples !== undefined) node.examples = examples
      if (node.secret === true) {
        delete node.secret
        node.writeOnly = true
      }
      if (
        node.type === 'string' &&
        path.at(-1) !== 'propertyNames' &&
        ('pattern' in node || 'format' in node || 'allOf' in node)
      )
        allowPlaceholder(node)
    },
  })
  const { $schema, ...rest } = schema
  return {
    $schema,
    $id: settingsSchemaId,
    title: 'Settings of Tautline',
    description: 'The settings file of the monitor, YAML 1.2.',
    ...rest,
  }
}

function allowPlaceholder(node: Record<string, unknown>): void {
  const own: Record<string, unknown> = {}
  for (const key of ['pattern', 'format', 'minLength', 'maxLength', 'allOf'])
    if (key in node) {
      own[key] = node[key]
      delete node[key]
    }
  node.anyOf = [own, { pattern: placeholder }]
}
