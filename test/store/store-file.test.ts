import { spawn } from 'node:child_process'
import { once } from 'node:events'
import { existsSync, readdirSync, readFileSync, statSync, symlinkSync, writeFileSync } from 'node:fs'
import { rm } from 'node:fs/promises'
import { join } from 'node:path'
import { fileURLToPath } from 'node:url'
import Database from 'libsql'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { TautlineError } from '../../src/errors.ts'
import { openStore, setAside } from '../../src/store/open-store.ts'
import { schemaVersion } from '../../src/store/schema.ts'
import { seal, unseal } from '../../src/store/sealed.ts'
import { runOrThrow, scratchFolder } from '../support/host.ts'

let folder: string
beforeAll(async () => {
  folder = await scratchFolder('store')
})
afterAll(async () => {
  await rm(folder, { recursive: true })
})

const codeOf = (work: () => unknown): string => {
  try {
    work()
  } catch (error) {
    if (error instanceof TautlineError) return error.code
    throw error
  }
  return 'no error'
}

const checkpoint = (ensembles: Record<string, unknown>) => ({
  version: 1,
  savedAt: 0,
  positions: {},
  ensembles,
})

describe('opening', () => {
  test('makes the folder and the file, and finds everything again', () => {
    const path = join(folder, 'new', 'state', 'tautline.db')
    const first = openStore(path)
    first.saveCheckpoint(checkpoint({ desk: Float64Array.of(1, 2) }))
    first.saveAlert('a', { ended: null })
    first.close()
    const second = openStore(path)
    expect(second.loadCheckpoint()?.ensembles.desk).toStrictEqual(Float64Array.of(1, 2))
    expect(second.alerts(9)).toEqual([{ ended: null }])
    second.close()
  })

  test('two processes may read and write: a second connection sees what the first has committed', () => {
    const path = join(folder, 'shared.db')
    const watch = openStore(path)
    const explain = openStore(path)
    watch.saveAlert('a', { ended: null })
    expect(explain.alert('a')).toEqual({ ended: null })
    watch.close()
    explain.close()
  })

  test('the file is in write-ahead mode and the journal refuses changes from any program', () => {
    const path = join(folder, 'guarded.db')
    const store = openStore(path)
    store.journal([{ time: 1, kind: 'shift', ensemble: 'desk', body: 1 }])
    store.close()
    const other = new Database(path)
    expect(other.prepare('PRAGMA journal_mode').get([])).toMatchObject({ journal_mode: 'wal' })
    expect(() => other.exec('DELETE FROM journal')).toThrow('append-only')
    expect(() => other.exec("UPDATE journal SET body = '2'")).toThrow('append-only')
    other.close()
  })

  test('a text file is foreign and left as it is', () => {
    const path = join(folder, 'notes.txt')
    writeFileSync(path, 'These are my notes, by no means a database.\n'.repeat(100))
    const before = readFileSync(path)
    expect(codeOf(() => openStore(path))).toBe('store-foreign')
    expect(readFileSync(path)).toEqual(before)
  })

  test("another program's database is foreign, even an empty one that it has marked as its own", () => {
    const withTable = join(folder, 'other.db')
    const other = new Database(withTable)
    other.exec('CREATE TABLE theirs (a)')
    other.close()
    expect(codeOf(() => openStore(withTable))).toBe('store-foreign')
    const marked = join(folder, 'marked.db')
    const another = new Database(marked)
    another.exec('PRAGMA application_id = 7')
    another.close()
    expect(codeOf(() => openStore(marked))).toBe('store-foreign')
  })

  test('a store of a later version is refused', () => {
    const path = join(folder, 'later.db')
    openStore(path).close()
    const later = new Database(path)
    later.exec(`PRAGMA user_version = ${schemaVersion + 1}`)
    later.close()
    expect(codeOf(() => openStore(path))).toBe('store-newer')
  })

  test('a store with overwritten pages is damaged; set aside, a new one takes its place', () => {
    const path = join(folder, 'damaged.db')
    const store = openStore(path)
    for (let i = 0; i < 200; i++) store.saveAlert(`a${i}`, { ended: null, text: 'x'.repeat(500) })
    store.close()
    const bytes = readFileSync(path)
    bytes.fill(0xa5, 3 * 4096)
    writeFileSync(path, bytes)
    expect(codeOf(() => openStore(path))).toBe('store-damaged')
    const aside = setAside(path, Date.UTC(2026, 10, 2, 10, 42, 5))
    expect(aside).toBe(`${path}.aside-2026-11-02T10-42-05-000Z`)
    expect(existsSync(path)).toBe(false)
    expect(readFileSync(aside)).toEqual(bytes)
    const fresh = openStore(path)
    expect(fresh.alerts(9)).toEqual([])
    fresh.close()
  })

  test('a folder, or a place that cannot be made, is a coded error', () => {
    expect(codeOf(() => openStore(folder))).toBe('store-unopened')
    writeFileSync(join(folder, 'file'), '')
    expect(codeOf(() => openStore(join(folder, 'file', 'tautline.db')))).toBe('store-unopened')
  })
})

describe('sealed checkpoints', () => {
  test('any single changed byte, any cut and any other format version is refused', () => {
    const sealed = seal({ desk: Float64Array.of(1, 2, 3), name: 'Northern desk' })
    expect(unseal(sealed)).toEqual({ desk: Float64Array.of(1, 2, 3), name: 'Northern desk' })
    for (let i = 0; i < sealed.length; i++) {
      const changed = sealed.slice()
      changed[i]! ^= 0x10
      expect(codeOf(() => unseal(changed))).toBe('checkpoint-unreadable')
      expect(codeOf(() => unseal(sealed.subarray(0, i)))).toBe('checkpoint-unreadable')
    }
  })

  test('a damaged checkpoint is refused while journal and alerts stay readable', () => {
    const path = join(folder, 'checkpoint.db')
    const store = openStore(path)
    store.saveCheckpoint(checkpoint({ desk: 'abc' }))
    store.saveAlert('a', { ended: null })
    const other = new Database(path)
    const row = other.prepare('SELECT sealed FROM checkpoint').get([]) as { sealed: ArrayBuffer }
    const bytes = Buffer.from(row.sealed)
    bytes.writeUInt8(bytes.readUInt8(20) ^ 1, 20)
    other.prepare('UPDATE checkpoint SET sealed = ?').run([bytes])
    other.close()
    expect(codeOf(() => store.loadCheckpoint())).toBe('checkpoint-unreadable')
    expect(store.alerts(9)).toEqual([{ ended: null }])
    store.close()
  })
})

describe('crash', () => {
  /** Writes transactions as fast as it can, and says after each that it is durable. */
  const writer = `
    import { writeSync } from 'node:fs'
    import { openStore } from './src/store/open-store.js'
    const store = openStore(process.argv[2])
    for (let n = 1; ; n++) {
      store.together(() => {
        store.saveCheckpoint({ version: n, savedAt: n, positions: {}, ensembles: { desk: new Float64Array(20_000).fill(n) } })
        store.saveAlert('a', { version: n, ended: null })
        store.enqueue([{ key: 'hook/a/' + n, route: 'hook', alert: 'a', version: n, payload: n, created: n,
          attempts: 0, notBefore: 0, giveUpAt: 1e12, lastError: null }])
        store.journal([{ time: n, kind: 'shift', ensemble: 'desk', body: n }])
      })
      writeSync(1, n + '\\n')
    }`

  let compiled: string
  beforeAll(async () => {
    compiled = await scratchFolder('store-writer')
    const root = fileURLToPath(new URL('../..', import.meta.url))
    await runOrThrow(
      join(root, 'node_modules/.bin/tsc'),
      [
        ...[
          '--ignoreConfig',
          '--target',
          'es2023',
          '--module',
          'nodenext',
          '--types',
          'node',
          '--skipLibCheck',
        ],
        ...['--rewriteRelativeImportExtensions', '--rootDir', root, '--outDir', compiled],
        join(root, 'src/store/open-store.ts'),
      ],
      { cwd: root },
    )
    symlinkSync(join(root, 'node_modules'), join(compiled, 'node_modules'))
    writeFileSync(join(compiled, 'package.json'), '{"type":"module"}')
    writeFileSync(join(compiled, 'writer.js'), writer)
  })
  afterAll(async () => {
    await rm(compiled, { recursive: true })
  })

  test('killed at any moment, the store opens and holds the last transaction whole, and none in part', async () => {
    const path = join(folder, 'crash.db')
    for (let round = 0; round < 6; round++) {
      await rm(path, { force: true })
      await rm(`${path}-wal`, { force: true })
      await rm(`${path}-shm`, { force: true })
      const child = spawn(process.execPath, [join(compiled, 'writer.js'), path], {
        stdio: ['ignore', 'pipe', 'inherit'],
      })
      let said = ''
      child.stdout.on('data', (chunk: Buffer) => {
        said += chunk.toString()
      })
      await once(child.stdout, 'data')
      await new Promise((resolve) => setTimeout(resolve, 37 * round + 5))
      child.kill('SIGKILL')
      await once(child, 'close')
      const acknowledged = Number(said.trimEnd().split('\n').at(-1))
      expect(acknowledged).toBeGreaterThan(0)

      const store = openStore(path)
      const found = store.loadCheckpoint()!
      const n = found.version
      // One more may have been committed than it had time to say.
      expect([acknowledged, acknowledged + 1]).toContain(n)
      expect(found.ensembles.desk).toStrictEqual(new Float64Array(20_000).fill(n))
      expect(store.alert('a')).toEqual({ version: n, ended: null })
      expect(store.waiting()).toBe(n)
      expect(store.readJournal({ limit: 1_000_000 }).map(({ body }) => body)).toEqual(
        Array.from({ length: n }, (_, i) => i + 1),
      )
      store.close()
    }
  })

  test('after a clean close the write-ahead log is gone or empty', () => {
    const path = join(folder, 'clean.db')
    const store = openStore(path)
    for (let n = 0; n < 50; n++) store.saveCheckpoint(checkpoint({ desk: new Float64Array(20_000).fill(n) }))
    store.close()
    const left = readdirSync(folder).filter((name) => name === 'clean.db-wal')
    for (const name of left) expect(statSync(join(folder, name)).size).toBe(0)
  })
})
