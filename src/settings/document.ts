import {
  isAlias,
  isCollection,
  isMap,
  isScalar,
  LineCounter,
  type Node,
  parseAllDocuments,
  type YAMLError,
} from 'yaml'
import { type Fault, keyText, type Path, type SettingsProblem } from './problem.ts'
import { type Environment, substitute } from './substitution.ts'

/** Most values that a file may hold, aliases written out. */
const mostNodes = 200_000
/** Deepest nesting; the parser's time and stack grow without bound with it. */
const deepest = 100
/** How a value is shown that is not there. */
const nothing = 'nothing'

interface Place {
  /** Offset of the key, or of the value where it has none. */
  readonly key: number
  readonly value: number
  /** What is written there, before anything was taken from the environment. */
  readonly shown: string
  /** Names of the variables that its text takes in. */
  readonly names: readonly string[]
}

/** The settings file as plain values, and where each of them stands. */
export class SettingsDocument {
  readonly file: string
  readonly value: unknown
  /** Whether it is YAML at all; only then `value` means anything. */
  readonly isReadable: boolean
  /** Faults of reading: syntax, duplicate keys, variables that are not set. */
  readonly faults: readonly SettingsProblem[]
  /** Values from the environment that are secrets. */
  readonly secrets: readonly string[]
  readonly #places: ReadonlyMap<string, Place>
  readonly #lines: LineCounter

  /** Parses YAML 1.2 (core schema). Never throws. */
  constructor(file: string, source: string, env: Environment) {
    this.file = file
    this.#lines = new LineCounter()
    const tooDeep = firstTooDeep(source)
    const documents = parseAllDocuments(tooDeep === null ? source : '', {
      version: '1.2',
      schema: 'core',
      merge: false,
      uniqueKeys: false,
      prettyErrors: false,
      lineCounter: this.#lines,
    })
    const reader = new Reader(env)
    const [document] = documents
    if (tooDeep !== null)
      reader.fault('syntax', [], tooDeep, `The YAML is nested deeper than ${deepest} levels.`)
    if (documents.length > 1)
      reader.fault('syntax', [], documents[1]!.range[0], 'The file holds more than one YAML document.')
    const errors = document ? [...document.errors, ...document.warnings] : []
    for (const error of errors) reader.refuse(error, source)
    this.isReadable = reader.faults.length === 0
    this.value = this.isReadable && document?.contents ? reader.read(document.contents, [], 0) : null
    this.secrets = reader.secrets
    this.#places = reader.places
    this.faults = reader.faults.map(({ offset, ...fault }) => this.#problem(fault, offset, null))
  }

  /** Whether the text at this path takes in a variable. */
  isSubstituted(path: Path): boolean {
    return (this.#places.get(keyText(path))?.names.length ?? 0) > 0
  }

  /** The fault with its place in the file. */
  locate(fault: Fault): SettingsProblem {
    let place = this.#places.get(keyText(fault.path))
    const found = place === undefined || fault.hidden || fault.at === 'key' ? null : place.shown
    for (let up = fault.path.slice(0, -1); place === undefined; up = up.slice(0, -1)) {
      place = this.#places.get(keyText(up))
      if (up.length === 0) break
    }
    const isAtKey = fault.at === 'key' || place?.shown === nothing
    const offset = place === undefined ? 0 : isAtKey ? place.key : place.value
    return this.#problem(fault, offset, found)
  }

  #problem(fault: Fault, offset: number, found: string | null): SettingsProblem {
    const { line, col } = this.#lines.linePos(offset)
    const { code, path, sentence, severity = 'error', allowed = null, nearest = null } = fault
    return {
      code,
      severity,
      file: this.file,
      line: Math.max(1, line),
      column: Math.max(1, col),
      key: keyText(path),
      sentence,
      found,
      allowed,
      nearest,
    }
  }
}

/** Turns YAML nodes into plain values, keeping where each stands. */
class Reader {
  readonly places = new Map<string, Place>()
  readonly faults: (Fault & { readonly offset: number })[] = []
  readonly secrets: string[] = []
  readonly #env: Environment
  readonly #open = new Set<Node>()
  readonly #anchors = new Map<string, Node>()
  #nodes = 0

  constructor(env: Environment) {
    this.#env = env
  }

  fault(kind: 'syntax' | 'duplicate-key' | 'variable', path: Path, offset: number, sentence: string): void {
    this.faults.push({ code: `settings-${kind}`, path, at: 'value', sentence, offset })
  }

  refuse(error: YAMLError, source: string): void {
    const [offset] = error.pos
    const lineStart = source.lastIndexOf('\n', offset - 1) + 1
    const line = source.slice(lineStart).split('\n', 1)[0]!
    const hint = /[{[,:]\s*[^"'\s]*\$\{/.test(line) ? ' Inside { } and [ ], put "${NAME}" in quotes.' : ''
    this.fault('syntax', [], offset, `The YAML cannot be read: ${yamlWords(error)}.${hint}`)
  }

  read(node: Node, path: Path, keyOffset: number): unknown {
    const offset = node.range?.[0] ?? keyOffset
    this.#nodes++
    if (this.#nodes > mostNodes) {
      if (this.#nodes === mostNodes + 1)
        this.fault('syntax', path, offset, `The file holds more than ${mostNodes} values.`)
      return null
    }
    if (isAlias(node)) return this.#follow(node.source, path, keyOffset, offset)
    if ('anchor' in node && typeof node.anchor === 'string') this.#anchors.set(node.anchor, node)
    const place = { key: keyOffset, value: offset }
    if (isScalar(node)) return this.#scalar(node.value, path, place)
    if (!isCollection(node)) return null
    this.#open.add(node)
    const value = isMap(node) ? this.#map(node, path, place) : this.#list(node, path, place)
    this.#open.delete(node)
    return value
  }

  #follow(anchor: string, path: Path, keyOffset: number, offset: number): unknown {
    const target = this.#anchors.get(anchor)
    if (target === undefined || this.#open.has(target)) {
      const why = target === undefined ? 'names no anchor above it' : 'lies inside what it stands for'
      this.fault('syntax', path, offset, `The alias *${anchor} ${why}.`)
      return null
    }
    const value = this.read(target, path, keyOffset)
    const place = this.places.get(keyText(path))
    if (place) this.places.set(keyText(path), { ...place, value: offset })
    return value
  }

  #scalar(value: unknown, path: Path, place: { key: number; value: number }): unknown {
    if (typeof value !== 'string') {
      const plain = typeof value === 'bigint' ? Number(value) : value
      this.places.set(keyText(path), {
        ...place,
        shown: plain === null ? nothing : String(plain),
        names: [],
      })
      return plain
    }
    const { text, names, secrets, faults } = substitute(value, this.#env)
    this.places.set(keyText(path), { ...place, shown: JSON.stringify(cut(value)), names })
    this.secrets.push(...secrets)
    for (const sentence of faults) this.fault('variable', path, place.value, sentence)
    if (text === '' && names.length > 0 && faults.length === 0)
      this.fault('variable', path, place.value, `${names.join(', ')} is set to nothing.`)
    return text
  }

  #map(node: { items: unknown[] }, path: Path, place: { key: number; value: number }) {
    this.places.set(keyText(path), { ...place, shown: 'a map', names: [] })
    const value: Record<string, unknown> = Object.create(null)
    for (const pair of node.items as { key: Node | null; value: Node | null }[]) {
      const offset = pair.key?.range?.[0] ?? place.value
      if (!isScalar(pair.key)) {
        this.fault('syntax', path, offset, 'A key is neither text nor a number.')
        continue
      }
      const key = String(pair.key.value)
      const inner = [...path, key]
      if (Object.hasOwn(value, key)) {
        this.fault('duplicate-key', inner, offset, 'This key stands twice in the same map.')
        continue
      }
      if (pair.value) value[key] = this.read(pair.value, inner, offset)
      else value[key] = this.#scalar(null, inner, { key: offset, value: offset })
    }
    return value
  }

  #list(node: { items: unknown[] }, path: Path, place: { key: number; value: number }) {
    this.places.set(keyText(path), { ...place, shown: `a list of ${node.items.length}`, names: [] })
    return (node.items as Node[]).map((item, i) =>
      this.read(item, [...path, i], item.range?.[0] ?? place.value),
    )
  }
}

/** What is shown of a text: its beginning, without a user name and password in an address. */
function cut(text: string): string {
  const bare = text.replace(/:\/\/[^@/\s]*@/, '://[hidden]@')
  return bare.length > 80 ? `${bare.slice(0, 79)}…` : bare
}

/** Offset at which brackets, or markers on one line, are nested too deeply; counted without regard to quotes. */
function firstTooDeep(source: string): number | null {
  let depth = 0
  for (const { 0: mark, index } of source.matchAll(/[[\]{}]/g)) {
    depth = mark === '[' || mark === '{' ? depth + 1 : Math.max(0, depth - 1)
    if (depth > deepest) return index
  }
  return new RegExp(`^(?:[ \\t]*[-?:](?=[ \\t])){${deepest}}`, 'm').exec(source)?.index ?? null
}

/** The parser's message without its quotation of the source, which may hold a secret. */
const yamlWords = (error: YAMLError) =>
  error.message
    .split('\n', 1)[0]!
    .replace(/:?\s*(["'`]).*\1/, '')
    .replace(/\.$/, '')
