// Compiles kernels.ts to WebAssembly and writes it as text into ../kernels-wasm.ts, so that an install needs
// no compiler. With --check it only compares and fails on a difference.
import { spawnSync } from 'node:child_process'
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { fileURLToPath } from 'node:url'

const here = fileURLToPath(new URL('.', import.meta.url))
const target = join(here, '..', 'kernels-wasm.ts')
const compiler = fileURLToPath(new URL('../../../node_modules/assemblyscript/bin/asc.js', import.meta.url))
const scratch = mkdtempSync(join(tmpdir(), 'tautline-kernels-'))
const out = join(scratch, 'kernels.wasm')
const options = [
  '-O3',
  '--noAssert',
  '--runtime',
  'stub',
  '--enable',
  'simd',
  '--importMemory',
  '--initialMemory',
  '1',
]
const built = spawnSync(process.execPath, [compiler, 'kernels.ts', '-o', out, ...options], {
  cwd: here,
  encoding: 'utf8',
})
if (built.status !== 0) throw new Error(built.stderr)
const lines =
  readFileSync(out)
    .toString('base64')
    .match(/.{1,100}/g) ?? []
rmSync(scratch, { recursive: true })
const text = `/** The module that \`npm run kernels\` builds from assembly/kernels.ts, base64. */
export const kernelsBase64 = [
${lines.map((line) => `  '${line}',`).join('\n')}
].join('')
`
if (process.argv.includes('--check')) {
  if (readFileSync(target, 'utf8') !== text)
    throw new Error('kernels-wasm.ts is not what assembly/kernels.ts builds: npm run kernels')
} else writeFileSync(target, text)
