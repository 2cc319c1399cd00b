import { type Browser, chromium } from 'playwright-core'

/** Starts the real browser without a window; `program` is `inject('chromium')`. Close it at the end. */
export const openBrowser = (program: string): Promise<Browser> =>
  chromium.launch({
    executablePath: program,
    headless: true,
    args: [
      ...(process.getuid?.() === 0 ? ['--no-sandbox'] : []),
      '--disable-gpu',
      '--disable-quic',
      '--no-first-run',
      '--disable-background-networking',
      '--disable-component-update',
      '--disable-sync',
    ],
  })
