import { closeSync, fstatSync, openSync, readFileSync } from 'node:fs'
import { dirname, resolve } from 'node:path'
import type { z } from 'zod'
import { failed, ok, type Result } from '../errors.ts'
import { crossFaults, secretFields } from './cross-checks.ts'
import { SettingsDocument } from './document.ts'
import { faultsOf } from './faults.ts'
import { type Fault, inOrder, keyText, type SettingsProblem } from './problem.ts'
import { withPathsFrom } from './relative-paths.ts'
import { type Settings, settingsSchema } from './schema.ts'
import { Secrets } from './secrets.ts'
import type { Environment } from './substitution.ts'

/** Largest settings file, in bytes. */
const largestSettings = 1024 * 1024

export interface ReadSettings {
  readonly settings: Settings
  /** What is allowed but likely not meant. */
  readonly warnings: readonly SettingsProblem[]
  /** Every secret of the settings, for the redaction of logs and errors. */
  readonly secrets: Secrets
}

/**
 * Reads the settings file at `path`. Fails with every problem there is, in the order of the file. Paths of
 * files inside the settings become absolute, counted from the folder of the settings file.
 */
export function readSettings(path: string, env: Environment): Result<ReadSettings, SettingsProblem[]> {
  const source = readSource(path)
  if (!source.ok) return failed([source.error])
  return parseSettings(path, source.value, env)
}

/** As `readSettings`, over a text in place of a file; `path` says what its relative paths count from. */
export function parseSettings(
  path: string,
  source: string,
  env: Environment,
): Result<ReadSettings, SettingsProblem[]> {
  const document = new SettingsDocument(path, source, env)
  const secrets = new Secrets()
  for (const secret of document.secrets) secrets.add(secret)
  const reading = [...document.faults]
  if (!document.isReadable) return refused(reading, secrets)

  const spoilt = new Set(reading.map(({ key }) => key))
  const shape = faultsOf(settingsSchema, document.value)
  const told = shape.filter(({ path }) => !spoilt.has(keyText(path)))
  const cross = checkTogether(document, shape, secrets).map((fault) => document.locate(fault))
  const problems = inOrder([...reading, ...told.map((fault) => document.locate(fault)), ...cross])
  const parsed = settingsSchema.safeParse(document.value)
  if (!parsed.success || problems.some(({ severity }) => severity === 'error'))
    return refused(problems.length > 0 ? problems : [strayFault(document, parsed.error)], secrets)
  return ok({ settings: withPathsFrom(dirname(resolve(path)), parsed.data), warnings: problems, secrets })
}

type Sections = Readonly<Record<string, unknown>>
const named = ['ensembles', 'feeds', 'routes'] as const

/** The cross checks over all that is right by itself, so that they too are told at once. */
function checkTogether(document: SettingsDocument, shape: readonly Fault[], secrets: Secrets): Fault[] {
  if (typeof document.value !== 'object' || document.value === null) return []
  const whole = document.value as Sections
  const sections: Record<string, unknown> = { ...whole }
  for (const { path } of shape) {
    const [section, name] = path
    if (section === undefined || (section === 'ensembles' && name === undefined)) return []
    const held = sections[section]
    if (named.some((one) => one === section) && typeof name === 'string' && isObject(held))
      sections[section] = Object.fromEntries(Object.entries(held).filter(([key]) => key !== name))
    else delete sections[section]
  }
  const parsed = settingsSchema.safeParse({ ensembles: {}, ...sections })
  if (!parsed.success) return []
  for (const { value } of secretFields(parsed.data)) secrets.add(value)
  const [ensembles, feeds, routes] = named.map((section) =>
    isObject(whole[section]) ? Object.keys(whole[section]) : [],
  ) as [string[], string[], string[]]
  const faults = crossFaults(parsed.data, { ensembles, feeds, routes }, document)
  return shape.length === 0 ? faults : faults.filter(({ severity }) => severity !== 'warning')
}

const isObject = (value: unknown): value is object => typeof value === 'object' && value !== null

/** The schema refuses what `faultsOf` lets pass: told in the schema's own words rather than not at all. */
function strayFault(document: SettingsDocument, error: z.ZodError | undefined): SettingsProblem {
  const [issue] = error?.issues ?? []
  const path = (issue?.path ?? []).filter((step) => typeof step !== 'symbol')
  const sentence = issue?.message ?? 'The settings are not allowed.'
  return document.locate({ code: 'settings-wrong-value', path, at: 'value', sentence })
}

const refused = (problems: readonly SettingsProblem[], secrets: Secrets) =>
  failed(
    inOrder(problems).map((problem) => ({
      ...problem,
      found: problem.found === null ? null : secrets.redact(problem.found),
    })),
  )

function readSource(path: string): Result<string, SettingsProblem> {
  const fault = (code: SettingsProblem['code'], sentence: string) =>
    failed({
      code,
      severity: 'error' as const,
      file: path,
      line: 1,
      column: 1,
      key: '',
      sentence,
      found: null,
      allowed: null,
      nearest: null,
    })
  let descriptor: number | null = null
  try {
    descriptor = openSync(path, 'r')
    const { size } = fstatSync(descriptor)
    if (size > largestSettings) return fault('settings-syntax', 'The file is longer than 1 MiB.')
    const bytes = readFileSync(descriptor)
    if (bytes.length > largestSettings) return fault('settings-syntax', 'The file is longer than 1 MiB.')
    const text = new TextDecoder('utf-8', { fatal: true }).decode(bytes)
    return ok(text)
  } catch (error) {
    if (error instanceof TypeError && descriptor !== null)
      return fault('settings-syntax', 'The file is not UTF-8 text.')
    const why = (error as NodeJS.ErrnoException).code ?? String(error)
    return fault('settings-missing', `The file cannot be read (${why}).`)
  } finally {
    if (descriptor !== null) closeSync(descriptor)
  }
}
