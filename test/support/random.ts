/** The seeded generator for tests: `new Random(7).normal()`. */
export { Random } from '../../demo-feeds/random.ts'
