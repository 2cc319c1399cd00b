import { Subject } from 'rxjs'

/** Emits once when the process is told to stop (SIGTERM, SIGINT); a second signal ends it at once. */
export function stopSignals(): { readonly asked: Subject<void>; release(): void } {
  const asked = new Subject<void>()
  let told = false
  const onSignal = (signal: NodeJS.Signals): void => {
    if (told) process.exit(signal === 'SIGINT' ? 130 : 143)
    told = true
    asked.next()
  }
  process.on('SIGTERM', onSignal)
  process.on('SIGINT', onSignal)
  return {
    asked,
    release() {
      process.off('SIGTERM', onSignal)
      process.off('SIGINT', onSignal)
    },
  }
}
