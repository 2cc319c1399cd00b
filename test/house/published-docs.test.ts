import { readFileSync } from 'node:fs'
import { fileURLToPath } from 'node:url'
import { describe, expect, it } from 'vitest'
import { errorCatalogue } from '../../src/errors.ts'
import { dropReasons } from '../../src/reasons.ts'
import { runLine } from '../commands/surroundings.ts'
import { withTables } from './documents.ts'

const readme = fileURLToPath(new URL('../../README.md', import.meta.url))
const root = fileURLToPath(new URL('../../', import.meta.url))
const text = () => readFileSync(readme, 'utf8')
const manifest = JSON.parse(readFileSync(`${root}package.json`, 'utf8'))

/** Lines of the fenced blocks of shell commands. */
const shellLines = () =>
  [...text().matchAll(/```sh\n([\s\S]*?)```/g)].flatMap(([, block]) =>
    block!
      .replaceAll(/\\\n\s*/g, '')
      .split('\n')
      .map((line) => line.replace(/\s+#.*$/, '').trim())
      .filter((line) => line !== ''),
  )

describe('README.md', () => {
  it('has the tables of settings, errors and drop reasons that the source gives; `npm run docs` writes them anew', async () => {
    await expect(withTables(text())).toMatchFileSnapshot(readme)
  })

  it('names every error and every drop reason once in its tables', () => {
    for (const code of Object.keys(errorCatalogue))
      expect(withTables(text()).split(`\n| \`${code}\` |`)).toHaveLength(2)
    for (const reason of Object.keys(dropReasons))
      expect(withTables(text()).split(`\n| \`${reason}\` |`)).toHaveLength(2)
  })

  it('shows only npm scripts that exist', () => {
    const scripts = shellLines().flatMap((line) => line.match(/npm run [\w-]+/g) ?? [])
    for (const script of scripts)
      expect(Object.keys(manifest.scripts)).toContain(script.replace('npm run ', ''))
  })

  it('shows only command lines that the program takes', async () => {
    const lines = shellLines().flatMap((line) =>
      [...line.matchAll(/(?:^|&& |\| )(?:npx )?tautline ([^|>&]*)/g)].map(([, args]) => args!.trim()),
    )
    expect(lines.length).toBeGreaterThan(5)
    const env = { HOOK_SECRET: 'a secret of more than 24 characters', PAGE_TOKEN: 'a token of some length' }
    for (const line of lines) {
      const args = line.split(/\s+/).map((arg) => (/^config\/.*\.yaml$/.test(arg) ? root + arg : arg))
      const ran = await runLine(args, { env })
      expect(`${line}: ${ran.stderr}`).not.toContain('(usage)')
    }
  })

  it('describes every command of the program', async () => {
    const { stdout } = await runLine(['--help'])
    const commands = [...stdout.matchAll(/^ {2}(watch|replay|check|explain|demo)\b/gm)].map(
      ([, name]) => name!,
    )
    expect(commands).toHaveLength(5)
    for (const name of commands) expect(text()).toContain(`| \`${name}\` |`)
  })
})
