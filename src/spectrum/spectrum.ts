/**
 * Spectrum of a symmetric n × n matrix. `values` holds all n eigenvalues, largest first.
 * `vectors` holds the first `modes` eigenvectors as rows of length n, unit Euclidean norm, the entry of
 * largest magnitude positive.
 */
export interface Spectrum {
  readonly n: number
  readonly values: Float64Array
  readonly modes: number
  readonly vectors: Float64Array
  /** Frames since `values` were computed in full; 0 is now. */
  readonly age: number
  /** Bound on W2 between `values` and the spectrum of the present matrix. */
  readonly bound: number
}

/**
 * Solves the symmetric eigenproblem. `matrix` is n × n row-major, symmetric, only the lower triangle is
 * read, and it is left unchanged.
 */
export interface SymmetricSolver {
  solve(matrix: Float64Array, n: number, modes: number): Spectrum
}
