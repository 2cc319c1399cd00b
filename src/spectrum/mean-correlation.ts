/** Mean of the entries below the diagonal of an n × n row-major correlation matrix; 0 for n below 2. */
export function meanCorrelation(matrix: Float64Array, n: number): number {
  if (n < 2) return 0
  let sum = 0
  for (let i = 1; i < n; i++) for (let j = 0; j < i; j++) sum += matrix[i * n + j]!
  return sum / ((n * (n - 1)) / 2)
}
