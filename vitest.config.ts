import { defineConfig } from 'vitest/config'

/**
 * Two projects: `core` needs nothing but Node; `services` starts the real Kafka, Prometheus, Alertmanager
 * and browser once for all its files (test/services/setup.ts) and fails where one cannot be had.
 */
export default defineConfig({
  test: {
    reporters: ['default', './test/support/closing-line.ts'],
    projects: [
      {
        test: {
          name: 'core',
          include: ['test/**/*.test.ts'],
          exclude: ['test/services/**'],
          testTimeout: 60_000,
        },
      },
      {
        test: {
          name: 'services',
          include: ['test/services/**/*.test.ts'],
          globalSetup: ['test/services/setup.ts'],
          testTimeout: 240_000,
          hookTimeout: 240_000,
          fileParallelism: false,
        },
      },
    ],
  },
})
