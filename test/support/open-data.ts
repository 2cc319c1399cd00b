import { createHash } from 'node:crypto'
import { mkdir, mkdtemp, readdir, readFile, rename, rm, stat, writeFile } from 'node:fs/promises'
import { dirname, join } from 'node:path'
import { gunzipSync } from 'node:zlib'
import { type TestContext, test } from 'vitest'
import { alone, cacheFolder, findProgram, runOrThrow } from './host.ts'
import { type RColumn, readLazyLoad, readWorkspace } from './r-data.ts'

/**
 * Open data that the package registries carry, fetched at first use by package name with the ordinary
 * clients, checked against the sha256 of its publication, and kept in the cache folder outside the
 * repository. None of it may be committed.
 */
export type OpenDataId = 'dj30' | 'sp20' | 'wind' | 'usemp'

export interface OpenTable {
  readonly id: OpenDataId
  /** Wide CSV: the column `date` (YYYY-MM-DD), then one column a signal. */
  readonly csvPath: string
  readonly signals: readonly string[]
  readonly dates: readonly string[]
  /** dates.length × signals.length, row-major, in the unit of the source. */
  readonly values: Float64Array
}

interface Source {
  /** What it is and who made it. */
  readonly title: string
  /** Fetches the package into `folder` and gives the wide CSV. */
  make(folder: string): Promise<string>
  /** sha256 of the source's own table, where it was published; the package itself is checked in any case. */
  readonly sha256?: string
  /** Name of the first column in the source's own table, where it was not `date`. */
  readonly timeColumn?: string
}

export const sha256 = (bytes: Buffer | string): string => createHash('sha256').update(bytes).digest('hex')

function checked(bytes: Buffer, what: string, expected: string): Buffer {
  const found = sha256(bytes)
  if (!found.startsWith(expected)) throw new Error(`${what} has sha256 ${found}, not ${expected}`)
  return bytes
}

async function debianPackage(folder: string, name: string, version: string, digest: string): Promise<void> {
  if (!findProgram('apt-get') || !findProgram('dpkg-deb')) throw new Error('no apt-get and dpkg-deb here')
  const download = ['apt-get', 'download', '-q', `${name}=${version}`] as const
  const fetch = () => runOrThrow(download[0], download.slice(1), { cwd: folder })
  await fetch().catch(async () => {
    await runOrThrow('apt-get', ['update', '-q'], { cwd: folder })
    await fetch()
  })
  const file = (await readdir(folder)).find((entry) => entry.startsWith(`${name}_`))!
  checked(await readFile(join(folder, file)), `${name} ${version}`, digest)
  await runOrThrow('dpkg-deb', ['-x', file, '.'], { cwd: folder })
}

/** What R's write.csv makes of these columns, unquoted. */
function csvText(columns: ReadonlyMap<string, RColumn>): string {
  const values = [...columns.values()]
  const rows = values[0]!.map((_, i) => values.map((column) => column[i]).join(','))
  return `${[...columns.keys()].join(',')}\n${rows.join('\n')}\n`
}

async function unbzip2(path: string): Promise<Buffer> {
  const plain = `${path}.plain`
  const program =
    'import bz2, sys; open(sys.argv[2], "wb").write(bz2.decompress(open(sys.argv[1], "rb").read()))'
  await runOrThrow('python3', ['-c', program, path, plain])
  return readFile(plain)
}

const sources: Readonly<Record<OpenDataId, Source>> = {
  dj30: {
    title: '30 stocks, daily closes 1990-12-31 to 2001-01-02 (Debian r-cran-fbasics, DowJones30)',
    sha256: '5a001dad5fbc3c95834e51b012b33f442a6cb88bffb9c0bac1be05e6b6108164',
    timeColumn: 'X.Y..m..d',
    async make(folder) {
      const digest = 'cca55f7eadc3adec0425c500858c8a29a98f97b0fc929f1d7bf1e730bf31e551'
      await debianPackage(folder, 'r-cran-fbasics', '4021.93-1', digest)
      const base = join(folder, 'usr/lib/R/site-library/fBasics/data/Rdata')
      const [index, objects] = await Promise.all([readFile(`${base}.rdx`), readFile(`${base}.rdb`)])
      return csvText(readLazyLoad(index, objects, 'DowJones30'))
    },
  },
  sp20: {
    title: '20 stocks, adjusted daily closes 1990-01-02 to 2022-12-28 (PyPI skfolio)',
    sha256: '5f769c6d7be57f62a4dfd1f553995855462a17c92b21a4af4245439c6115617f',
    timeColumn: 'Date',
    async make(folder) {
      await runOrThrow('pip', ['download', '-q', '--no-deps', '-d', folder, 'skfolio==1.12.2'])
      const wheel = (await readdir(folder)).find((entry) => entry.endsWith('.whl'))!
      const member = 'skfolio/datasets/data/sp500_dataset.csv.gz'
      const take = 'import sys, zipfile; zipfile.ZipFile(sys.argv[1]).extract(sys.argv[2], ".")'
      await runOrThrow('python3', ['-c', take, wheel, member], { cwd: folder })
      const packed = checked(
        await readFile(join(folder, member)),
        member,
        'ee21cac28befb1d0a739a9ceb22184f995394726aa0cfde9a21941d1ac04ac0d',
      )
      return gunzipSync(packed).toString()
    },
  },
  wind: {
    title:
      'wind at 12 stations, daily means 1961 to 1978, knots (Haslett & Raftery 1989; Debian r-cran-gstat)',
    async make(folder) {
      const digest = 'a0cdb533bb1b27dc2ed9da3ca23a8688d1af3ae8d3b5b35c805ca749cfc8a887'
      await debianPackage(folder, 'r-cran-gstat', '2.1-0-1', digest)
      const path = join(folder, 'usr/lib/R/site-library/gstat/data/wind.rda')
      const columns = readWorkspace(await unbzip2(path), 'wind')
      const two = (value: unknown) => String(value).padStart(2, '0')
      const [year, month, day] = ['year', 'month', 'day'].map((name) => columns.get(name)!)
      const date = year!.map((y, i) => `19${two(y)}-${two(month![i])}-${two(day![i])}`)
      const stations = [...columns].filter(([name]) => !['year', 'month', 'day'].includes(name))
      return csvText(new Map([['date', date], ...stations]))
    },
  },
  usemp: {
    title: 'employment by sector, 22 series × 120 months from 2006-01, thousands (npm vega-datasets)',
    async make(folder) {
      await runOrThrow('npm', ['pack', '--silent', '--pack-destination', folder, 'vega-datasets@3.2.1'])
      const archive = (await readdir(folder)).find((entry) => entry.endsWith('.tgz'))!
      const member = 'package/data/us-employment.csv'
      await runOrThrow('tar', ['-xzf', archive, member], { cwd: folder })
      const digest = '0fa5366929bf738ac420509b84ed120155f740b0fa9c265ca309dad4057d1b1b'
      const text = checked(await readFile(join(folder, member)), member, digest).toString()
      // The last column is the monthly change of the first: no level, and negative at times.
      const lines = text.trimEnd().split('\n')
      const levels = lines.map((line) => line.slice(0, line.lastIndexOf(',')))
      return `date${levels.join('\n').slice('month'.length)}\n`
    },
  },
}

function parseWide(id: OpenDataId, csvPath: string, text: string): OpenTable {
  const [head, ...rows] = text.trimEnd().split('\n')
  const signals = head!.split(',').slice(1)
  const dates: string[] = []
  const values = new Float64Array(rows.length * signals.length)
  rows.forEach((row, i) => {
    const fields = row.split(',')
    dates.push(fields[0]!)
    for (let j = 0; j < signals.length; j++) values[i * signals.length + j] = Number(fields[j + 1])
  })
  return { id, csvPath, signals, dates, values }
}

/** The wide CSV as the source has it, checked; then with `date` as the name of its first column. */
async function fetchCsv(id: OpenDataId, csvPath: string): Promise<void> {
  const source = sources[id]
  await mkdir(dirname(csvPath), { recursive: true })
  const folder = await mkdtemp(join(cacheFolder, `${id}-`))
  try {
    const text = await source.make(folder)
    if (source.sha256) checked(Buffer.from(text), `the table of ${id}`, source.sha256)
    const head = source.timeColumn ? `date${text.slice(source.timeColumn.length)}` : text
    await writeFile(join(folder, 'table.csv'), head)
    await rename(join(folder, 'table.csv'), csvPath)
  } finally {
    await rm(folder, { recursive: true, force: true })
  }
}

/** The table, fetched if it is not in the cache. Throws where the registry or its client is not to be had. */
export async function openData(id: OpenDataId): Promise<OpenTable> {
  const csvPath = join(cacheFolder, 'open-data', `${id}.csv`)
  if (!(await stat(csvPath).catch(() => null)))
    await alone(`open-data-${id}`, async () => {
      if (!(await stat(csvPath).catch(() => null))) await fetchCsv(id, csvPath)
    })
  return parseWide(id, csvPath, await readFile(csvPath, 'utf8'))
}

/** The text of the source's own table, whose sha256 its publication states. */
export async function sourceText({ id, csvPath }: OpenTable): Promise<string> {
  const text = await readFile(csvPath, 'utf8')
  return (sources[id].timeColumn ?? 'date') + text.slice('date'.length)
}

/**
 * A test that needs open data. Where they cannot be had it is skipped with "open data not available", but
 * fails when CI=true.
 */
export function testWithOpenData(
  id: OpenDataId,
  title: string,
  check: (table: OpenTable, context: TestContext) => void | Promise<void>,
): void {
  test(title, { timeout: 240_000 }, async (context) => {
    const table = await openData(id).catch((error: unknown) => {
      if (process.env.CI === 'true') throw error
      return context.skip(`skipped: open data not available (${sources[id].title}): ${error}`)
    })
    await check(table, context)
  })
}
