import { gunzipSync, inflateSync } from 'node:zlib'

/**
 * Reads data frames out of R's serialised objects (binary XDR form, versions 2 and 3), without R.
 * Format: "R Internals", section "Serialization Formats", and R's own serialize.c, both from memory;
 * checked by the published sha256 of the tables that come out.
 */

export type RColumn = (number | string | null)[]
interface RVector {
  readonly items: readonly RItem[]
  readonly attributes: ReadonlyMap<string, RItem>
}
type RItem = null | number | string | RVector | RPairs
interface RPairs {
  readonly pairs: readonly (readonly [string, RItem])[]
}

const naInteger = -(2 ** 31)

/** Type codes of serialize.c. */
const code = {
  symbol: 1,
  pairlist: 2,
  string: 9,
  logical: 10,
  integer: 13,
  real: 14,
  strings: 16,
  list: 19,
  missingArgument: 251,
  baseEnvironment: 241,
  emptyEnvironment: 242,
  persistent: 247,
  globalEnvironment: 253,
  nil: 254,
  reference: 255,
} as const

class Reader {
  readonly #bytes: Buffer
  #at = 0
  readonly #references: RItem[] = []

  constructor(bytes: Buffer) {
    this.#bytes = bytes
  }

  header(): void {
    const magic = this.#bytes.toString('latin1', 0, 2)
    if (magic !== 'X\n') throw new Error(`not R's XDR form: begins ${JSON.stringify(magic)}`)
    this.#at = 2
    const version = this.#integer()
    this.#at += 8
    if (version !== 2 && version !== 3) throw new Error(`serialisation version ${version}`)
    if (version === 3) this.#text(this.#integer())
  }

  #integer(): number {
    this.#at += 4
    return this.#bytes.readInt32BE(this.#at - 4)
  }

  #real(): number {
    this.#at += 8
    return this.#bytes.readDoubleBE(this.#at - 8)
  }

  #length(): number {
    const short = this.#integer()
    return short === -1 ? this.#integer() * 2 ** 32 + this.#integer() : short
  }

  #text(bytes: number): string {
    this.#at += bytes
    return this.#bytes.toString('utf8', this.#at - bytes, this.#at)
  }

  item(): RItem {
    const flags = this.#integer()
    const type = flags & 0xff
    switch (type) {
      case code.nil:
      case code.missingArgument:
      case code.baseEnvironment:
      case code.emptyEnvironment:
      case code.globalEnvironment:
        return null
      case code.reference:
        return this.#references[(flags >> 8 || this.#integer()) - 1] ?? null
      case code.symbol: {
        const name = this.item()
        this.#references.push(name)
        return name
      }
      case code.persistent: {
        this.#integer()
        const count = this.#integer()
        for (let i = 0; i < count; i++) this.item()
        this.#references.push(null)
        return null
      }
      case code.string: {
        const bytes = this.#integer()
        return bytes < 0 ? null : this.#text(bytes)
      }
      case code.pairlist:
        return this.#pairlist(flags)
      case code.logical:
      case code.integer:
        return this.#vector(flags, () => {
          const value = this.#integer()
          return value === naInteger ? null : value
        })
      case code.real:
        return this.#vector(flags, () => this.#real())
      case code.strings:
      case code.list:
        return this.#vector(flags, () => this.item())
      default:
        throw new Error(`R object of type ${type} at byte ${this.#at - 4} is not read here`)
    }
  }

  #vector(flags: number, one: () => RItem): RVector {
    const items = Array.from({ length: this.#length() }, one)
    const attributes = (flags & 0x200) !== 0 ? (this.item() as RPairs).pairs : []
    return { items, attributes: new Map(attributes) }
  }

  #pairlist(first: number): RPairs {
    const pairs: [string, RItem][] = []
    for (let flags = first; (flags & 0xff) === code.pairlist; flags = this.#integer()) {
      if ((flags & 0x200) !== 0) this.item()
      const tag = (flags & 0x400) !== 0 ? String(this.item()) : ''
      pairs.push([tag, this.item()])
    }
    return { pairs }
  }
}

function parse(bytes: Buffer): RItem {
  const reader = new Reader(bytes)
  reader.header()
  return reader.item()
}

const vector = (item: RItem | undefined): RVector => {
  if (item === null || typeof item !== 'object' || !('items' in item)) throw new Error('an R vector expected')
  return item
}

function member(list: RItem, name: string): RItem {
  const { items, attributes } = vector(list)
  const at = vector(attributes.get('names')).items.indexOf(name)
  if (at < 0) throw new Error(`no member ${name}`)
  return items[at]!
}

/** Columns of a data frame by name, in order; factors as their labels. */
function dataFrame(item: RItem): Map<string, RColumn> {
  const { items, attributes } = vector(item)
  const names = vector(attributes.get('names')).items.map(String)
  return new Map(
    names.map((name, i) => {
      const column = vector(items[i])
      const levels = column.attributes.get('levels')
      const values = column.items as RColumn
      if (!levels) return [name, values]
      const labels = vector(levels).items as RColumn
      return [name, values.map((level) => (level === null ? null : labels[Number(level) - 1]!))]
    }),
  )
}

/** A data frame of a package's lazy-load data base: `index` is its .rdx file, `base` its .rdb file. */
export function readLazyLoad(index: Buffer, base: Buffer, name: string): Map<string, RColumn> {
  const variables = member(parse(index[0] === 0x1f ? gunzipSync(index) : inflateSync(index)), 'variables')
  const [start, bytes] = vector(member(variables, name)).items.map(Number)
  // Four bytes of the uncompressed length, then a zlib stream.
  const packed = base.subarray(start! + 4, start! + bytes!)
  return dataFrame(parse(inflateSync(packed)))
}

/** A data frame of an .rda file whose compression has been taken off. */
export function readWorkspace(bytes: Buffer, name: string): Map<string, RColumn> {
  const magic = bytes.toString('latin1', 0, 5)
  if (!/^RDX[23]\n$/.test(magic)) throw new Error(`not an R workspace: begins ${JSON.stringify(magic)}`)
  const top = parse(bytes.subarray(5)) as RPairs
  const found = top.pairs.find(([tag]) => tag === name)
  if (!found) throw new Error(`no object ${name}`)
  return dataFrame(found[1])
}
