import { hostAndPort, isLoopback } from './addresses.ts'
import type { SettingsDocument } from './document.ts'
import { ensembleFaults, reference } from './ensemble-checks.ts'
import type { Fault, Path } from './problem.ts'
import type { KafkaConnection, Settings } from './schema.ts'

/** The names that the file defines, whether or not what stands under them is right. */
export interface DefinedNames {
  readonly ensembles: readonly string[]
  readonly feeds: readonly string[]
  readonly routes: readonly string[]
}

/** What no single value shows: names that refer to nothing, settings that do not go together. */
export function crossFaults(settings: Settings, names: DefinedNames, document: SettingsDocument): Fault[] {
  return [
    ...Object.entries(settings.ensembles).flatMap(([name, ensemble]) =>
      ensembleFaults(name, ensemble, names.feeds),
    ),
    ...(settings.heartbeat?.routes ?? []).flatMap((route, i) =>
      reference(['heartbeat', 'routes', i], route, names.routes, 'route'),
    ),
    ...wholeFaults(settings, names),
    ...portFaults(settings),
    ...secretFaults(settings, document),
  ]
}

function wholeFaults(settings: Settings, defined: DefinedNames): Fault[] {
  const { ensembles, feeds, routes, heartbeat, page } = settings
  const faults: Fault[] = []
  const conflict = (path: Path, sentence: string): Fault => ({
    code: 'settings-conflict',
    path,
    at: 'key',
    sentence,
  })
  const names = Object.keys(ensembles)
  if (defined.ensembles.length === 0)
    faults.push({ ...conflict(['ensembles'], 'Nothing is watched.'), allowed: 'one ensemble or more' })
  const pipes = Object.keys(feeds).filter((name) => 'stdin' in feeds[name]!)
  for (const name of pipes.slice(1))
    faults.push(conflict(['feeds', name], `Standard input is already read by the feed ${pipes[0]}.`))
  for (const [name, feed] of Object.entries(feeds))
    if ('kafka' in feed && typeof feed.format === 'object' && 'csv' in feed.format)
      faults.push({
        ...conflict(['feeds', name, 'format'], 'A table with a head line cannot come on a Kafka topic.'),
        allowed: 'ndjson, senml, or pointers',
      })
  if (hostAndPort(page.listen) !== null && !isLoopback(page.listen) && page.token === undefined)
    faults.push({
      code: 'settings-exposed',
      path: ['page', 'listen'],
      at: 'value',
      sentence: 'The page would be open to everyone who reaches this address.',
      allowed: 'a loopback address, or any with page.token',
    })
  for (const [setting, period] of [
    [['heartbeat', 'every'], heartbeat?.every],
    ...Object.entries(routes).map(([name, route]) => [['routes', name, 'timeout'], route.timeout] as const),
  ] as const)
    if (period !== undefined && period < 100)
      faults.push({
        ...conflict(setting, 'This is too short a time.'),
        at: 'value',
        allowed: 'at least 100ms',
      })

  const warn = (path: Path, sentence: string) =>
    faults.push({ ...conflict(path, sentence), severity: 'warning' })
  const drawn = new Set(names.flatMap((name) => ensembles[name]!.feeds ?? Object.keys(feeds)))
  for (const name of Object.keys(feeds))
    if (names.length > 0 && !drawn.has(name)) warn(['feeds', name], 'No ensemble draws from this feed.')
  if (Object.keys(feeds).length === 0)
    warn(['feeds'], 'No feed is set: only `replay --from FILE` has something to read.')
  if (Object.keys(routes).length === 0)
    warn(['routes'], 'No route is set: alerts are on the page and in the journal, and nobody is called.')
  else if (heartbeat === undefined)
    warn(['heartbeat'], 'No heartbeat is set: when the monitor falls silent, nobody is called.')
  return faults
}

/** Kafka connections by their path. */
const connections = ({ feeds, routes }: Settings): (readonly [Path, KafkaConnection])[] => [
  ...Object.entries(feeds).flatMap(([name, feed]) =>
    'kafka' in feed ? [[['feeds', name, 'kafka'], feed.kafka] as const] : [],
  ),
  ...Object.entries(routes).flatMap(([name, route]) =>
    'kafka' in route ? [[['routes', name, 'kafka'], route.kafka] as const] : [],
  ),
]

function portFaults(settings: Settings): Fault[] {
  const addresses: (readonly [Path, string])[] = [
    [['page', 'listen'], settings.page.listen],
    ...connections(settings).flatMap(([path, { brokers }]) =>
      brokers.map((address, i) => [[...path, 'brokers', i], address] as const),
    ),
  ]
  return addresses.flatMap(([path, address]): Fault[] =>
    hostAndPort(address) !== null
      ? []
      : [
          {
            code: 'settings-wrong-value',
            path,
            at: 'value',
            sentence: 'There is no such port.',
            allowed: 'a port from 0 to 65535',
          },
        ],
  )
}

export interface SecretField {
  readonly path: Path
  readonly value: string
  /** Every address that gets to know the secret. */
  readonly addresses: readonly string[]
}

export function secretFields(settings: Settings): SecretField[] {
  const { page, routes } = settings
  const fields: SecretField[] = []
  const add = (path: Path, value: string | undefined, addresses: readonly string[]) => {
    if (value !== undefined) fields.push({ path, value, addresses })
  }
  add(['page', 'token'], page.token, [page.listen])
  for (const [path, { sasl, brokers }] of connections(settings))
    add([...path, 'sasl', 'password'], sasl?.password, brokers)
  for (const [name, route] of Object.entries(routes)) {
    if ('alertmanager' in route)
      add(['routes', name, 'alertmanager', 'password'], route.alertmanager.password, route.alertmanager.urls)
    if ('webhook' in route)
      add(['routes', name, 'webhook', 'secret'], route.webhook.secret, [route.webhook.url])
  }
  return fields
}

const secretFaults = (settings: Settings, document: SettingsDocument): Fault[] =>
  secretFields(settings)
    .filter(({ path, addresses }) => !document.isSubstituted(path) && !addresses.every(isLoopback))
    .map(({ path }) => ({
      code: 'settings-secret',
      path,
      at: 'value',
      sentence: 'A secret is written in plain, and not all addresses concerned are loopback.',
      allowed: '"${NAME}", taken from the environment or from the file that NAME_FILE names',
      hidden: true,
    }))
