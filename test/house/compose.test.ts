import { existsSync, readFileSync } from 'node:fs'
import { resolve } from 'node:path'
import { fileURLToPath } from 'node:url'
import { Ajv } from 'ajv'
import formats from 'ajv-formats'
import { describe, expect, it } from 'vitest'
import { parse } from 'yaml'
import { parseSettings } from '../../src/settings/read-settings.ts'

const root = fileURLToPath(new URL('../../', import.meta.url))
const read = (path: string) => readFileSync(resolve(root, path), 'utf8')

interface Service {
  readonly image?: string
  readonly build?: unknown
  readonly volumes?: readonly string[]
  readonly secrets?: readonly string[]
  readonly ports?: readonly string[]
  readonly environment?: Readonly<Record<string, string>>
  readonly depends_on?: Readonly<Record<string, { readonly condition: string }>>
  readonly healthcheck?: Readonly<Record<string, unknown>>
  readonly command?: readonly string[]
  readonly read_only?: boolean
}
interface Compose {
  readonly services: Readonly<Record<string, Service>>
  readonly volumes: Readonly<Record<string, unknown>>
  readonly secrets: Readonly<Record<string, unknown>>
}

const source = read('docker-compose.yml')
const compose: Compose = parse(source, { merge: true })
const services = Object.entries(compose.services)

/** The specification's schema, less the address of its dialect, which the validator knows by another spelling. */
const specification = () => {
  const { $schema, ...schema } = JSON.parse(read('test/house/compose-spec/compose-spec.json'))
  const ajv = new Ajv({ allErrors: true, strict: false })
  formats.default(ajv)
  return ajv.compile(schema)
}

/** Files of the repository that a service mounts. */
const mounts = services.flatMap(([name, { volumes = [] }]) =>
  volumes
    .filter((volume) => volume.startsWith('./'))
    .map((volume) => [name, ...volume.split(':')] as string[]),
)

describe('docker-compose.yml', () => {
  it('follows the schema of the compose specification', () => {
    const validate = specification()
    expect(validate(parse(source, { merge: true })), JSON.stringify(validate.errors)).toBe(true)
  })

  it('would be refused by that schema with an unknown key or a port that is none', () => {
    const validate = specification()
    expect(validate({ services: { a: { image: 'a:1', volums: [] } } })).toBe(false)
    expect(validate({ services: { a: { image: 'a:1', ports: [{}, true] } } })).toBe(false)
  })

  it('has the monitor, Kafka, Prometheus and Alertmanager', () => {
    expect(Object.keys(compose.services)).toEqual(
      expect.arrayContaining(['tautline', 'kafka', 'prometheus', 'alertmanager']),
    )
  })

  it.each(services)('%s: its image is pinned by a tag that names a version', (_, { image }) => {
    expect(image).toMatch(/^[a-z0-9./-]+:v?\d+\.\d+\.\d+$/)
  })

  it('the image that it builds carries the version of the package', () => {
    expect(compose.services.tautline?.image).toBe(`tautline:${JSON.parse(read('package.json')).version}`)
  })

  it.each(mounts)('%s: the mounted %s exists', (_, path) => {
    expect(existsSync(resolve(root, path!))).toBe(true)
  })

  it('mounts nothing of the repository for writing', () => {
    expect(mounts.map(([, , , mode]) => mode)).toEqual(mounts.map(() => 'ro'))
  })

  it('defines every volume, secret and service that it refers to', () => {
    for (const [, service] of services) {
      const named = (service.volumes ?? [])
        .filter((volume) => !volume.startsWith('./'))
        .map((volume) => volume.split(':')[0])
      expect(Object.keys(compose.volumes)).toEqual(expect.arrayContaining(named))
      expect(Object.keys(compose.secrets)).toEqual(expect.arrayContaining([...(service.secrets ?? [])]))
      for (const [other, { condition }] of Object.entries(service.depends_on ?? {})) {
        expect(Object.keys(compose.services)).toContain(other)
        if (condition === 'service_healthy') expect(compose.services[other]?.healthcheck).toBeDefined()
      }
    }
  })

  it('publishes every port on loopback alone', () => {
    for (const [, { ports = [] }] of services)
      for (const port of ports) expect(port).toMatch(/^127\.0\.0\.1:\d+:\d+$/)
  })

  it('the monitor runs on a file system that it cannot write, but for its state', () => {
    expect(compose.services.tautline).toMatchObject({
      read_only: true,
      volumes: expect.arrayContaining(['state:/var/lib/tautline']),
    })
  })

  it('the settings that it mounts are right in the environment that it gives', () => {
    const [, path] = mounts.find(
      ([name, , target]) => name === 'tautline' && target === '/etc/tautline/settings.yaml',
    )!
    const { environment = {} } = compose.services.tautline!
    const env = Object.fromEntries(Object.keys(environment).map((name) => [name, 'a text of some length']))
    const settings = parseSettings(resolve(root, path!), read(path!), env)
    expect(settings.ok ? [] : settings.error).toEqual([])
    if (!settings.ok) return
    const { feeds, routes, page, store } = settings.value.settings
    // Every host that the settings name is a service of this file, every topic one that it makes.
    const connections = [...Object.values(feeds), ...Object.values(routes)].flatMap((item) =>
      'kafka' in item ? [item.kafka] : [],
    )
    const made = String(compose.services.topics?.command)
      .match(/for topic in ([^;]+);/)?.[1]
      ?.split(' ')
    for (const { brokers, topic } of connections) {
      expect(brokers).toEqual(['kafka:9092'])
      expect(made).toContain(topic)
    }
    for (const route of Object.values(routes))
      if ('alertmanager' in route) expect(route.alertmanager.urls).toEqual(['http://alertmanager:9093'])
    expect(page.listen.split(':')[1]).toBe(compose.services.tautline?.ports?.[0]?.split(':')[2])
    expect(store.path.startsWith('/var/lib/tautline/')).toBe(true)
  })

  it('gives Prometheus the shipped set-up and the token of the page', () => {
    const shipped = parse(read('config/prometheus/prometheus.yml'))
    const mounted = parse(read('config/compose-prometheus.yml'))
    const [{ authorization, ...job }] = mounted.scrape_configs
    expect({ ...mounted, scrape_configs: [job] }).toEqual(shipped)
    const secret = authorization.credentials_file.split('/').at(-1)
    expect(compose.services.prometheus?.secrets).toContain(secret)
    expect(compose.secrets[secret]).toEqual({ environment: 'PAGE_TOKEN' })
  })

  it('the demo producers send what the monitor watches', () => {
    for (const [name, topic, feed] of [
      ['demo-desk', 'ticks', 'desk'],
      ['demo-station', 'station', 'station'],
    ] as const) {
      const { command = [], image } = compose.services[name]!
      expect(image).toBe(compose.services.tautline?.image)
      expect(command[command.indexOf('--topic') + 1]).toBe(topic)
      expect(command[command.indexOf('--feed') + 1]).toBe(feed)
    }
  })
})
