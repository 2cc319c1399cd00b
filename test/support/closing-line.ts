import type { Reporter, TestModule } from 'vitest/node'

/** Prints the closing line `N passed, N failed` that scripts read. */
export default class ClosingLine implements Reporter {
  onTestRunEnd(modules: readonly TestModule[], errors: readonly unknown[], reason: string): void {
    let passed = 0
    let failed = errors.length
    let skipped = 0
    for (const module of modules) {
      failed += module.errors().length
      for (const test of module.children.allTests()) {
        const { state } = test.result()
        if (state === 'passed') passed++
        else if (state === 'failed') failed++
        else skipped++
      }
    }
    // A set-up that fails leaves no test behind to count.
    if (failed === 0 && reason === 'failed') failed = 1
    console.log(`\n${passed} passed, ${failed} failed${skipped > 0 ? `, ${skipped} skipped` : ''}`)
  }
}
