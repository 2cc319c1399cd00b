import type { Commands } from './commands.ts'
import { packageVersion } from './package-version.ts'
import { program } from './program.ts'

/** Runs the command line of this process over the commands and sets its exit status. */
export async function main(commands: Commands): Promise<void> {
  // A reader that has seen enough, such as `head`, is no failure.
  process.stdout.on('error', (error: NodeJS.ErrnoException) => {
    if (error.code === 'EPIPE') process.exit(0)
    throw error
  })
  const { stdout, stderr, env } = process
  const line = program(commands, packageVersion(), { stdout, stderr, env, now: Date.now })
  process.exitCode = await line.run(process.argv.slice(2))
}
