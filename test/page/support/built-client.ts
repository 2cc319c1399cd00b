import { fileURLToPath, pathToFileURL } from 'node:url'
import { runOrThrow, scratchFolder } from '../../support/host.ts'

const path = (relative: string): string => fileURLToPath(new URL(relative, import.meta.url))

/** Compiles the browser part of the page as the build does; gives its folder and the scratch folder to remove. */
export async function builtClient(): Promise<{ readonly folder: URL; readonly scratch: string }> {
  const scratch = await scratchFolder('client')
  const compiler = path('../../../node_modules/typescript/bin/tsc')
  await runOrThrow(process.execPath, [compiler, '-p', path('./tsconfig.client.json'), '--outDir', scratch])
  return { folder: pathToFileURL(`${scratch}/page/client/`), scratch }
}
