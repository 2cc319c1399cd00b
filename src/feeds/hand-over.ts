import type { Subscriber } from 'rxjs'
import type { FeedEvent } from './feed.ts'

type Given = Omit<Extract<FeedEvent, { type: 'batch' }>, 'type' | 'done'>

/** Gives a batch to the listener; resolves when it has called `done()`, or when `stop` is aborted. */
export function handOver(to: Subscriber<FeedEvent>, given: Given, stop: AbortSignal): Promise<void> {
  return new Promise((resolve) => {
    if (stop.aborted) return resolve()
    const done = () => {
      stop.removeEventListener('abort', done)
      resolve()
    }
    stop.addEventListener('abort', done, { once: true })
    to.next({ type: 'batch', ...given, done })
  })
}
