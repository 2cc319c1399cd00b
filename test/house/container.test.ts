import { existsSync, readFileSync, statSync } from 'node:fs'
import { resolve } from 'node:path'
import { fileURLToPath } from 'node:url'
import { describe, expect, it } from 'vitest'

const root = fileURLToPath(new URL('../../', import.meta.url))
const read = (path: string) => readFileSync(resolve(root, path), 'utf8')
const manifest = JSON.parse(read('package.json'))

/** Instructions of the Dockerfile, continued lines joined. */
const instructions = read('Dockerfile')
  .replaceAll(/\\\n/g, ' ')
  .split('\n')
  .filter((line) => /^[A-Z]+ /.test(line))
  .map((line) => line.split(/\s+/))

const copied = instructions.flatMap(([word, ...rest]) =>
  word === 'COPY' && !rest[0]!.startsWith('--') ? rest.slice(0, -1) : [],
)

describe('Dockerfile', () => {
  it('starts from images pinned by the tag of a version, on the Node that the package asks for', () => {
    const images = instructions.flatMap(([word, image]) => (word === 'FROM' ? [image!] : []))
    expect(images.length).toBeGreaterThan(1)
    for (const image of images) expect(image).toMatch(/^node:20\.\d+\.\d+-bookworm-slim$/)
    expect(manifest.engines.node).toBe('>=20.19')
    expect(Number(images[0]!.split('.')[1])).toBeGreaterThanOrEqual(19)
  })

  it.each(copied)('copies %s, which exists and is not ignored', (path) => {
    expect(existsSync(resolve(root, path))).toBe(true)
    const kept = read('.dockerignore')
      .split('\n')
      .filter((line) => line.startsWith('!'))
      .map((line) => line.slice(1))
    expect(kept).toContain(path.replace(/^\.\//, ''))
  })

  it('keeps in its context only what it copies', () => {
    const lines = read('.dockerignore').trim().split('\n')
    expect(lines[0]).toBe('*')
    expect(new Set(lines.slice(1).map((line) => line.slice(1)))).toEqual(new Set(copied))
  })

  it('runs as a user without rights, asks /health/live, and starts the program of the package', () => {
    const word = (name: string) =>
      instructions.filter(([first]) => first === name).map(([, ...rest]) => rest.join(' '))
    expect(word('USER')).toEqual(['node'])
    expect(word('HEALTHCHECK')[0]).toContain('/health/live')
    expect(word('ENTRYPOINT')).toEqual([`["node", "/app/${manifest.bin.tautline}"]`])
  })
})

describe('package.json', () => {
  it.each((manifest.files as string[]).filter((name) => name !== 'dist'))(
    'ships %s, which exists',
    (name) => {
      expect(existsSync(resolve(root, name))).toBe(true)
    },
  )

  it('its program is built from a source that exists', () => {
    expect(
      existsSync(resolve(root, manifest.bin.tautline.replace(/^dist\//, '').replace(/\.js$/, '.ts'))),
    ).toBe(true)
  })
})

describe('.ci/run', () => {
  it('is executable, stops at the first failure, installs, checks and tests', () => {
    expect(statSync(resolve(root, '.ci/run')).mode & 0o111).toBeGreaterThan(0)
    const script = read('.ci/run')
    for (const line of ['set -euo pipefail', 'npm ci', 'npm run check', 'npm test'])
      expect(script.split('\n')).toContain(line)
  })
})
