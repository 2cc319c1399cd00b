import { resolve } from 'node:path'
import type { EnsembleSettings, FeedSettings, KafkaConnection, RouteSettings, Settings } from './schema.ts'

/** The settings with every path of a file made absolute; relative ones count from `folder`. */
export function withPathsFrom(folder: string, settings: Settings): Settings {
  const from = (path: string) => (path === ':memory:' ? path : resolve(folder, path))
  const each = <T>(map: Record<string, T>, change: (item: T) => T): Record<string, T> =>
    Object.fromEntries(Object.entries(map).map(([name, item]) => [name, change(item)]))
  return {
    ...settings,
    ensembles: each(settings.ensembles, (ensemble) => ensemblePaths(ensemble, from)),
    feeds: each(settings.feeds, (feed) => feedPaths(feed, from)),
    routes: each(settings.routes, (route) => routePaths(route, from)),
    store: { ...settings.store, path: from(settings.store.path) },
  }
}

type From = (path: string) => string

function ensemblePaths(ensemble: EnsembleSettings, from: From): EnsembleSettings {
  const { signals, reference } = ensemble
  return {
    ...ensemble,
    signals: 'file' in signals ? { file: from(signals.file) } : signals,
    reference: 'from' in reference ? { from: from(reference.from) } : reference,
  }
}

function feedPaths(feed: FeedSettings, from: From): FeedSettings {
  if ('file' in feed) return { ...feed, file: { ...feed.file, path: from(feed.file.path) } }
  if ('kafka' in feed) return { ...feed, kafka: connectionPaths(feed.kafka, from) }
  return feed
}

const routePaths = (route: RouteSettings, from: From): RouteSettings =>
  'kafka' in route ? { ...route, kafka: connectionPaths(route.kafka, from) } : route

function connectionPaths<T extends KafkaConnection>(connection: T, from: From): T {
  const { tls } = connection
  if (typeof tls !== 'object') return connection
  const files = Object.fromEntries(
    (['ca', 'cert', 'key'] as const).flatMap((name) => {
      const path = tls[name]
      return path === undefined ? [] : [[name, from(path)]]
    }),
  )
  return { ...connection, tls: { ...tls, ...files } }
}
