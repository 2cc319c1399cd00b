import { createHash } from 'node:crypto'
import { readdir, readFile } from 'node:fs/promises'
import { TautlineError } from '../errors.ts'
import { markSvg } from './frame-html.ts'
import { styleCss } from './style.ts'

export interface Asset {
  readonly type: string
  readonly body: string
  readonly etag: string
}

/** Everything under `/assets/`, by name, read once. `folder` holds the compiled client. @throws TautlineError `page-unbuilt` */
export async function clientAssets(
  folder = new URL('./client/', import.meta.url),
): Promise<ReadonlyMap<string, Asset>> {
  const scripts = (await readdir(folder).catch(() => [])).filter((name) => name.endsWith('.js'))
  if (!scripts.includes('app.js'))
    throw new TautlineError('page-unbuilt', `${folder.pathname} holds no app.js.`)
  const assets = new Map<string, Asset>()
  for (const name of scripts) {
    const text = await readFile(new URL(name, folder), 'utf8')
    assets.set(
      name,
      asset('text/javascript; charset=utf-8', text.replace(/^\/\/# sourceMappingURL=.*$/m, '')),
    )
  }
  assets.set('style.css', asset('text/css; charset=utf-8', styleCss))
  assets.set('mark.svg', asset('image/svg+xml', markSvg))
  return assets
}

const asset = (type: string, body: string): Asset => ({
  type,
  body,
  etag: `"${createHash('sha256').update(body).digest('base64url').slice(0, 22)}"`,
})
