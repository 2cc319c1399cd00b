import { accessSync, constants, existsSync, readFileSync, statSync } from 'node:fs'
import { dirname } from 'node:path'
import { TautlineError } from '../errors.ts'
import { readReference } from '../regime/reference-record.ts'
import type { Settings } from '../settings/schema.ts'
import { openStore } from '../store/open-store.ts'
import type { Tried } from './check.ts'

/** Tries the files that the settings name, other than those of feeds, which try their own. Makes none. */
export function tryFiles(settings: Settings): Tried[] {
  const tried: Tried[] = []
  for (const { signals, reference } of Object.values(settings.ensembles)) {
    if ('file' in signals) tried.push(tryFile(signals.file, namesIn))
    if ('from' in reference) tried.push(tryFile(reference.from, referenceIn))
  }
  for (const item of [...Object.values(settings.feeds), ...Object.values(settings.routes)]) {
    const tls = 'kafka' in item ? item.kafka.tls : undefined
    if (typeof tls !== 'object') continue
    for (const path of [tls.ca, tls.cert, tls.key]) if (path !== undefined) tried.push(tryFile(path, pemIn))
  }
  return [...tried, tryStore(settings.store.path)]
}

type Finding = Pick<Tried, 'ok' | 'detail'>

function tryFile(path: string, look: (text: string) => Finding): Tried {
  try {
    return { what: 'file', name: path, ...look(readFileSync(path, 'utf8')) }
  } catch (error) {
    return { what: 'file', name: path, ok: false, detail: `cannot be read (${why(error)})` }
  }
}

const why = (error: unknown) => (error as NodeJS.ErrnoException).code ?? String(error)

/** Signal names, one a line. */
function namesIn(text: string): Finding {
  const names = text.split(/\r?\n/).filter((line) => line.trim() !== '')
  if (names.length < 2) return { ok: false, detail: 'holds fewer than two signal names, one a line' }
  const twice = names.find((name, i) => names.indexOf(name) < i)
  if (twice !== undefined) return { ok: false, detail: `names ${twice} twice` }
  return { ok: true, detail: `${names.length} signals` }
}

function referenceIn(text: string): Finding {
  let json: unknown
  try {
    json = JSON.parse(text)
  } catch {
    return { ok: false, detail: 'is no JSON' }
  }
  const read = readReference(json)
  return read.ok
    ? {
        ok: true,
        detail: `a reference of ${read.value.names.length} signals over ${read.value.frames} frames`,
      }
    : { ok: false, detail: read.error.message }
}

const pemIn = (text: string): Finding =>
  text.includes('-----BEGIN ') ? { ok: true, detail: 'PEM' } : { ok: false, detail: 'is no PEM file' }

function tryStore(path: string): Tried {
  const words = { what: 'store', name: path } as const
  try {
    if (path !== ':memory:' && existsSync(path)) {
      if (!statSync(path).isFile()) return { ...words, ok: false, detail: 'is no file' }
      openStore(path).close()
      return { ...words, ok: true, detail: 'holds the state of an earlier run' }
    }
    if (path === ':memory:') return { ...words, ok: true, detail: 'kept in memory, lost at the end' }
    let folder = dirname(path)
    while (!existsSync(folder)) folder = dirname(folder)
    accessSync(folder, constants.W_OK)
    return { ...words, ok: true, detail: 'will be made' }
  } catch (error) {
    const detail = error instanceof TautlineError ? error.message : `cannot be written (${why(error)})`
    return { ...words, ok: false, detail }
  }
}
