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
  // store
  'store-unopened': {
    sentence: 'The store cannot be opened.',
    remedy:
      'Make sure that the folder of store.path exists or can be made, that the user of the monitor may write there, and that the disk has room.',
  },
  'store-foreign': {
    sentence: 'The file at store.path is no store of this monitor.',
    remedy: 'Give another store.path; the file is left as it is.',
  },
  'store-damaged': {
    sentence: 'The store is damaged.',
    remedy:
      'Move the file away (with its -wal and -shm companions) and start again: the monitor then learns afresh from its feeds. Keep the file if you want to look for lost entries.',
  },
  'store-newer': {
    sentence: 'The store was written by a later version of this monitor.',
    remedy: 'Run that version or a later one, or give another store.path to start afresh.',
  },
  'checkpoint-unreadable': {
    sentence: 'The checkpoint in the store cannot be read.',
    remedy: 'Nothing needs doing: the monitor learns afresh from its feeds; journal and alerts are kept.',
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
