import { Writable } from 'node:stream'
import type { Commands, ExitStatus, Surroundings } from '../../src/commands/commands.ts'
import { program } from '../../src/commands/program.ts'

/** A stream that remembers what was written to it. */
class Heard extends Writable {
  text = ''
  override _write(chunk: Buffer, _: string, done: () => void): void {
    this.text += chunk.toString()
    done()
  }
}

export interface Ran {
  readonly status: ExitStatus
  readonly stdout: string
  readonly stderr: string
  /** Name and options of the commands that were called. */
  readonly calls: readonly (readonly [string, Record<string, unknown>])[]
}

export const version = '1.2.3'

/** Runs the command line over commands that remember their options, or over the given ones. */
export async function runLine(
  args: readonly string[],
  { env = {}, commands = {} }: { env?: Record<string, string>; commands?: Partial<Commands> } = {},
): Promise<Ran> {
  const [stdout, stderr] = [new Heard(), new Heard()]
  const io: Surroundings = { stdout, stderr, env, now: () => Date.UTC(2026, 10, 2) }
  const calls: (readonly [string, Record<string, unknown>])[] = []
  const remember = (name: string) => async (options: object) => {
    calls.push([name, options as Record<string, unknown>])
    return 0 as const
  }
  const all = Object.fromEntries(
    ['watch', 'replay', 'check', 'explain', 'demo'].map((name) => [name, remember(name)]),
  ) as unknown as Commands
  const status = await program({ ...all, ...commands }, version, io).run(args)
  return { status, stdout: stdout.text, stderr: stderr.text, calls }
}
