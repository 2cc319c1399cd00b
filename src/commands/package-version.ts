import { existsSync, readFileSync } from 'node:fs'
import { dirname, join } from 'node:path'

/** The version of the package that this file belongs to, built or not. */
export function packageVersion(): string {
  let folder = import.meta.dirname
  while (!existsSync(join(folder, 'package.json'))) folder = dirname(folder)
  return JSON.parse(readFileSync(join(folder, 'package.json'), 'utf8')).version
}
