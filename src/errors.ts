/**
 * One catalogue of all errors that a user can meet: code, sentence, remedy. A test ties it to
 * DEVELOPERS.md's and README's table, and every `TautlineError` takes its code from here.
 * Add an entry beside those of its room.
 */
export const errorCatalogue = {
  // settings
  'settings-missing': {
    sentence: 'The settings file cannot be read.',
    remedy: 'Give an existing YAML file with --settings FILE; config/ holds two to start from.',
  },
  // command line
  usage: {
    sentence: 'The command line is not understood.',
    remedy: 'Run `tautline --help` or `tautline COMMAND --help` for the options and examples.',
  },
} as const satisfies Record<string, { sentence: string; remedy: string }>

export type ErrorCode = keyof typeof errorCatalogue

/** An error that a user caused or can mend. Printed as code, sentence, detail and remedy, never with a stack. */
export class TautlineError extends Error {
  readonly code: ErrorCode
  readonly detail: string

  constructor(code: ErrorCode, detail: string, options?: { cause?: unknown }) {
    super(`${errorCatalogue[code].sentence} ${detail}`, options)
    this.name = 'TautlineError'
    this.code = code
    this.detail = detail
  }

  get remedy(): string {
    return errorCatalogue[this.code].remedy
  }
}

/** A failure as a value: what an operation gives instead of throwing inside the stream. */
export type Result<T, E = TautlineError> =
  | { readonly ok: true; readonly value: T }
  | { readonly ok: false; readonly error: E }

export const ok = <T>(value: T): Result<T, never> => ({ ok: true, value })
export const failed = <E>(error: E): Result<never, E> => ({ ok: false, error })
