import { spawnSync } from 'node:child_process'
import { fileURLToPath } from 'node:url'
import { expect, test } from 'vitest'

const build = fileURLToPath(new URL('../../src/spectrum/assembly/build.mjs', import.meta.url))

test('the built kernels are what their sources build', () => {
  const { status, stderr } = spawnSync(process.execPath, [build, '--check'], { encoding: 'utf8' })
  expect(stderr).toBe('')
  expect(status).toBe(0)
})
