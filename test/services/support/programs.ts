import { chmod, mkdir, mkdtemp, rename, rm, stat, writeFile } from 'node:fs/promises'
import { basename, dirname, join } from 'node:path'
import { GenericContainer } from 'testcontainers'
import { alone, cacheFolder, findProgram, isProgram, run, runOrThrow } from '../../support/host.ts'

/** A program of another project that the tests need, and where it can come from. */
export interface WantedProgram {
  readonly title: string
  /** Environment variable that may hold its full path. */
  readonly variable: string
  /** Names to look for on the PATH. */
  readonly names: readonly string[]
  /** Debian package that holds it. */
  readonly debian: string
  /** Image, with its tag, that holds it as one self-contained Linux program. */
  readonly image?: { readonly name: string; readonly path: string }
}

export const wantedPrograms = {
  prometheus: {
    title: 'Prometheus',
    variable: 'TAUTLINE_TEST_PROMETHEUS',
    names: ['prometheus'],
    debian: 'prometheus',
    image: { name: 'prom/prometheus:v2.53.4', path: '/bin/prometheus' },
  },
  promtool: {
    title: 'promtool',
    variable: 'TAUTLINE_TEST_PROMTOOL',
    names: ['promtool'],
    debian: 'prometheus',
    image: { name: 'prom/prometheus:v2.53.4', path: '/bin/promtool' },
  },
  alertmanager: {
    title: 'Alertmanager',
    variable: 'TAUTLINE_TEST_ALERTMANAGER',
    names: ['alertmanager', 'prometheus-alertmanager'],
    debian: 'prometheus-alertmanager',
    image: { name: 'prom/alertmanager:v0.28.1', path: '/bin/alertmanager' },
  },
  chromium: {
    title: 'Chromium',
    variable: 'TAUTLINE_TEST_CHROMIUM',
    names: ['chromium', 'chromium-browser', 'google-chrome', 'google-chrome-stable'],
    debian: 'chromium',
  },
} as const satisfies Record<string, WantedProgram>

/** Takes a program out of its image into the cache folder; Linux only, since it then runs on this machine. */
async function programFromImage(image: { name: string; path: string }): Promise<string | null> {
  if (process.platform !== 'linux') return null
  const target = join(cacheFolder, image.name.replaceAll(/[/:]/g, '-'), basename(image.path))
  return alone('image-programs', async () => {
    if (await stat(target).catch(() => null)) return target
    await mkdir(dirname(target), { recursive: true })
    const work = await mkdtemp(join(cacheFolder, 'image-'))
    const container = await new GenericContainer(image.name)
      .withEntrypoint(['sleep'])
      .withCommand(['120'])
      .start()
    try {
      const archive = await container.copyArchiveFromContainer(image.path)
      const chunks: Buffer[] = []
      for await (const chunk of archive) chunks.push(Buffer.from(chunk))
      await writeFile(join(work, 'program.tar'), Buffer.concat(chunks))
      await runOrThrow('tar', ['-xf', 'program.tar'], { cwd: work })
      await chmod(join(work, basename(image.path)), 0o755)
      await rename(join(work, basename(image.path)), target)
    } finally {
      await container.stop()
      await rm(work, { recursive: true, force: true })
    }
    return target
  })
}

const mayInstall = (): boolean =>
  findProgram('apt-get') !== null && (process.getuid?.() === 0 || process.env.CI === 'true')

/**
 * Installs Debian packages without their recommended ones and without starting what they bring: the file
 * policy-rc.d (status 101: "action forbidden by policy") is put in place meanwhile, unless there is one.
 */
async function installDebian(packages: readonly string[]): Promise<void> {
  const sudo = process.getuid?.() === 0 ? [] : ['sudo', '-n']
  const asRoot = (command: readonly string[], input?: string) => {
    const [program, ...args] = [...sudo, 'env', 'DEBIAN_FRONTEND=noninteractive', ...command]
    return run(program!, args, input === undefined ? {} : { input })
  }
  const policy = '/usr/sbin/policy-rc.d'
  const ownPolicy = (await stat(policy).catch(() => null)) === null
  const wait = ['-o', 'DPkg::Lock::Timeout=600']
  if (ownPolicy) {
    await asRoot(['tee', policy], '#!/bin/sh\nexit 101\n')
    await asRoot(['chmod', '755', policy])
  }
  try {
    const update = await asRoot(['apt-get', ...wait, 'update', '-q'])
    const install = await asRoot([
      'apt-get',
      ...wait,
      'install',
      '-y',
      '-q',
      '--no-install-recommends',
      ...packages,
    ])
    if (install.code !== 0)
      throw new Error(
        `apt-get install ${packages.join(' ')}: ${`${update.stderr}\n${install.stderr}`.slice(-1500)}`,
      )
  } finally {
    if (ownPolicy) await asRoot(['rm', '-f', policy])
  }
}

export interface FoundPrograms<Name extends string> {
  readonly found: Readonly<Partial<Record<Name, string>>>
  /** One line for each program that could not be had. */
  readonly missing: readonly string[]
}

/**
 * Finds or installs the wanted programs: environment, PATH, container image (where `engine` says that a
 * container engine answers), Debian package.
 */
export async function findPrograms<Name extends string>(
  wanted: Readonly<Record<Name, WantedProgram>>,
  engine: boolean,
): Promise<FoundPrograms<Name>> {
  const names = Object.keys(wanted) as Name[]
  const found: Partial<Record<Name, string>> = {}
  const failures: string[] = []
  const look = (name: Name) => {
    const path = findProgram(...wanted[name].names)
    if (path) found[name] = path
    return path !== null
  }
  const wrong = names.filter((name) => {
    const stated = process.env[wanted[name].variable]
    if (stated && isProgram(stated)) found[name] = stated
    return stated && !isProgram(stated)
  })
  if (wrong.length > 0)
    return {
      found,
      missing: wrong.map((name) => `${wanted[name].variable} names no program that can be run`),
    }
  for (const name of names) {
    const { image } = wanted[name]
    if (found[name] || look(name) || !image || !engine) continue
    const path = await programFromImage(image).catch((error) => {
      failures.push(`${image.name}: ${error}`)
      return null
    })
    if (path) found[name] = path
  }
  const absent = () => names.filter((name) => found[name] === undefined)
  if (absent().length > 0 && mayInstall())
    await alone('debian-packages', async () => {
      const still = absent().filter((name) => !look(name))
      if (still.length === 0) return
      await installDebian([...new Set(still.map((name) => wanted[name].debian))])
      still.forEach(look)
    }).catch((error) => failures.push(String(error)))
  const missing = absent().map(
    (name) =>
      `${wanted[name].title}: put \`${wanted[name].names[0]}\` on the PATH (Debian: apt-get install ${wanted[name].debian}) or its full path in ${wanted[name].variable}`,
  )
  return { found, missing: missing.length > 0 ? [...missing, ...failures] : [] }
}
