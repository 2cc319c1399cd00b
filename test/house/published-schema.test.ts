import { readdirSync, readFileSync } from 'node:fs'
import { fileURLToPath } from 'node:url'
import { Ajv2020 } from 'ajv/dist/2020.js'
import formats from 'ajv-formats'
import { describe, expect, it } from 'vitest'
import { parse } from 'yaml'
import { settingsJsonSchema } from '../../src/settings/json-schema.ts'
import { parseSettings } from '../../src/settings/read-settings.ts'
import { wrongSettings } from '../settings/wrong-settings.ts'

const root = fileURLToPath(new URL('../../', import.meta.url))
const published = `${root}schema/settings.schema.json`

const ajv = new Ajv2020({ allErrors: true, strict: true, strictTypes: false, strictRequired: false })
formats.default(ajv)

describe('schema/settings.schema.json', () => {
  it('is what the source gives; `npm run schema` writes it anew', async () => {
    await expect(`${JSON.stringify(settingsJsonSchema(), null, 2)}\n`).toMatchFileSnapshot(published)
  })

  const validate = ajv.compile(settingsJsonSchema())
  const allows = (text: string): boolean => validate(parse(text, { schema: 'core' }))

  it.each(readdirSync(`${root}config`).filter((name) => name.endsWith('.yaml')))(
    'accepts config/%s',
    (name) => {
      expect(allows(readFileSync(`${root}config/${name}`, 'utf8')), JSON.stringify(validate.errors)).toBe(
        true,
      )
    },
  )

  // What a JSON Schema cannot say is left to the checks of the program.
  const beyondSchema = new Set([
    'settings-conflict',
    'settings-unknown-name',
    'settings-secret',
    'settings-exposed',
    'settings-variable',
    'settings-syntax',
    'settings-duplicate-key',
  ])
  const within = wrongSettings.filter(
    ({ code, env, allowed }) =>
      !beyondSchema.has(code) &&
      env === undefined &&
      allowed !== 'a port from 0 to 65535' &&
      allowed !== 'mon-fri',
  )
  it('is held against most of the wrong settings', () => {
    expect(within.length).toBeGreaterThan(60)
  })
  it.each(within.map(({ title, text }) => [title, text.replace('‸', '')] as const))(
    'refuses %s',
    (_, text) => {
      expect(allows(text)).toBe(false)
    },
  )

  it('lets a variable stand for any text, and describes every key', () => {
    expect(
      allows('ensembles: { a: { signals: [A, B], clock: { step: "${STEP}" }, window: { frames: 20 } } }'),
    ).toBe(true)
    const undescribed: string[] = []
    const look = (node: unknown, at: string): void => {
      if (typeof node !== 'object' || node === null) return
      for (const [key, child] of Object.entries(node)) {
        if (key === 'properties')
          for (const [name, property] of Object.entries(child as Record<string, { description?: string }>))
            if (!property.description) undescribed.push(`${at}.${name}`)
        look(child, `${at}/${key}`)
      }
    }
    look(settingsJsonSchema(), '')
    expect(undescribed).toEqual([])
  })
})

describe('config/', () => {
  const env = { HOOK_SECRET: 'a secret of more than 24 characters', PAGE_TOKEN: 'a token of some length' }
  it.each(readdirSync(`${root}config`).filter((name) => name.endsWith('.yaml')))(
    '%s is right, without a warning',
    (name) => {
      const path = `${root}config/${name}`
      const read = parseSettings(path, readFileSync(path, 'utf8'), env)
      expect(read.ok ? read.value.warnings : read.error).toEqual([])
    },
  )
})
