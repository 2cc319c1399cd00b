import { readFileSync, statSync } from 'node:fs'

export type Environment = Readonly<Record<string, string | undefined>>

/** Largest file from which a value is taken, in bytes. */
const largestFile = 64 * 1024

export interface Substituted {
  readonly text: string
  /** Names that were replaced. */
  readonly names: readonly string[]
  /** Values that came from a file, or from a variable that says by its name that it is a secret. */
  readonly secrets: readonly string[]
  /** What could not be replaced, in sentences. */
  readonly faults: readonly string[]
}

/**
 * Replaces every `${NAME}` by the environment's NAME or else by the contents of the file that NAME_FILE
 * names, less one newline at its end; `$${` stands for `${` itself.
 */
export function substitute(written: string, env: Environment): Substituted {
  const names: string[] = []
  const secrets: string[] = []
  const faults: string[] = []
  const text = written.replaceAll(/\$\$\{|\$\{([^}]*)\}?/g, (found, name: string | undefined) => {
    if (name === undefined) return '${'
    if (!found.endsWith('}') || !/^[A-Za-z_][A-Za-z0-9_]*$/.test(name)) {
      faults.push('A ${…} holds something else than the name of a variable; $${ stands for ${ itself.')
      return found
    }
    names.push(name)
    const { value, fault, isSecret } = lookUp(name, env)
    if (fault !== null) faults.push(fault)
    if (isSecret) secrets.push(value)
    return value
  })
  return { text, names, secrets, faults }
}

interface LookUp {
  readonly value: string
  readonly fault: string | null
  readonly isSecret: boolean
}

function lookUp(name: string, env: Environment): LookUp {
  const value = env[name]
  if (value !== undefined) return { value, fault: null, isSecret: /SECRET|PASSW|TOKEN|KEY/i.test(name) }
  const path = env[`${name}_FILE`]
  if (path === undefined)
    return {
      value: '',
      fault: `Neither ${name} nor ${name}_FILE is set in the environment.`,
      isSecret: false,
    }
  try {
    if (statSync(path).size > largestFile)
      return { value: '', fault: `The file that ${name}_FILE names is longer than 64 KiB.`, isSecret: false }
    return { value: readFileSync(path, 'utf8').replace(/\r?\n$/, ''), fault: null, isSecret: true }
  } catch (error) {
    const why = (error as NodeJS.ErrnoException).code ?? 'unknown error'
    return { value: '', fault: `The file that ${name}_FILE names cannot be read (${why}).`, isSecret: false }
  }
}
