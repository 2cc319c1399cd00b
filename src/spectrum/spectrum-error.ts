export type SpectrumFault = 'not-finite' | 'too-large' | 'not-converged' | 'bad-order'

const sentences: Readonly<Record<SpectrumFault, string>> = {
  'not-finite': 'the matrix has an entry that is not finite',
  'too-large': 'an eigenvalue is larger than a number can be',
  'not-converged': 'the iteration did not converge',
  'bad-order': 'the order is no whole number, or the matrix holds fewer than n × n entries',
}

/** Why a symmetric eigenproblem has no answer. A solver throws it and gives no spectrum, never one with NaN. */
export class SpectrumError extends RangeError {
  readonly fault: SpectrumFault

  constructor(fault: SpectrumFault, n: number) {
    super(`${sentences[fault]} (order ${n})`)
    this.name = 'SpectrumError'
    this.fault = fault
  }
}
