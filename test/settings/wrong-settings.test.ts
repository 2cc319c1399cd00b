import { describe, expect, it } from 'vitest'
import { errorCatalogue } from '../../src/errors.ts'
import { problemLines, type SettingsProblem } from '../../src/settings/problem.ts'
import { parseSettings } from '../../src/settings/read-settings.ts'
import { wrongSettings } from './wrong-settings.ts'

const mark = '‸'

/** The text without its mark, and the place of the mark. */
function unmark(marked: string) {
  const offset = marked.indexOf(mark)
  expect(offset, 'the text holds the mark').toBeGreaterThanOrEqual(0)
  const before = marked.slice(0, offset).split('\n')
  return { text: marked.replace(mark, ''), line: before.length, column: before.at(-1)!.length + 1 }
}

function errorsOf(text: string, env: Readonly<Record<string, string>> = {}): readonly SettingsProblem[] {
  const read = parseSettings('desk.yaml', text, env)
  return read.ok ? [] : read.error.filter(({ severity }) => severity === 'error')
}

describe('a wrong setting is told with its place, its key, what was found and what is allowed', () => {
  it('covers at least sixty of them', () => {
    expect(wrongSettings.length).toBeGreaterThanOrEqual(60)
  })

  it.each(wrongSettings.map((wrong) => [wrong.title, wrong] as const))('%s', (_, wrong) => {
    const { text, line, column } = unmark(wrong.text)
    const errors = errorsOf(text, wrong.env)
    expect(errors.map(({ key, code }) => `${code} ${key}`)[0]).toBe(`${wrong.code} ${wrong.key}`)
    if (wrong.code !== 'settings-syntax') expect(errors).toHaveLength(1)
    const [error] = errors
    expect({ line: error!.line, column: error!.column }).toEqual({ line, column })
    expect(error!.file).toBe('desk.yaml')
    if (wrong.nearest !== undefined) expect(error!.nearest).toBe(wrong.nearest)
    if (wrong.found !== undefined) expect(error!.found).toBe(wrong.found)
    if (wrong.allowed !== undefined) expect(error!.allowed).toContain(wrong.allowed)
    expect(Object.keys(errorCatalogue)).toContain(error!.code)
    const printed = problemLines(error!).join('\n')
    expect(printed).toContain(`desk.yaml:${line}:${column}:`)
    expect(printed).not.toContain('hunter22')
  })
})
