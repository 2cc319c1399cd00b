/**
 * The one shape of all estimators over vectors: `push` takes one in, `drop` takes it out again, getters read.
 * `present[i] = 0` marks an entry that is missing; its place in `x` holds 0.
 * The contract test runs over every estimator: drop undoes push, the order of signals does not matter,
 * equal to the batch formula at every step.
 */
export interface Estimator {
  push(x: Float64Array, present: Uint8Array): void
  drop(x: Float64Array, present: Uint8Array): void
}
