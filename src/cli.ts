#!/usr/bin/env node
import { openRoute } from './alerts/open-route.ts'
import { check } from './commands/check.ts'
import type { KeptEnsemble } from './commands/checkpoints.ts'
import { demo } from './commands/demo.ts'
import { explain } from './commands/explain.ts'
import { main } from './commands/main.ts'
import { replay } from './commands/replay.ts'
import { watch } from './commands/watch.ts'
import { referenceInState } from './compose.ts'
import { ok } from './errors.ts'
import { kafkaClient } from './feeds/kafka-client.ts'
import { openFeed } from './feeds/open-feed.ts'
import { structuredLog } from './observe/log.ts'

const quiet = (): void => {}

await main({
  watch,
  replay,
  demo,
  check: (options) => {
    const { io, logLevel, read } = options
    const log = structuredLog({
      level: logLevel,
      destination: io.stderr,
      redact: (text) => read.secrets.redact(text),
      now: io.now,
    })
    return check(options, {
      openFeed: (name, settings) => ok(openFeed(name, settings, { now: io.now, log: quiet })),
      openRoute: (name, settings) =>
        openRoute(name, settings, { log, kafka: (connection) => kafkaClient(connection, quiet) }),
    })
  },
  explain: (options) =>
    explain(options, { referenceOf: (kept) => referenceInState((kept as KeptEnsemble).state) }),
})
