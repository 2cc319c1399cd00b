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
  'settings-wrong': {
    sentence: 'The settings are wrong.',
    remedy: 'Mend the lines named above; schema/settings.schema.json lets an editor help with it.',
  },
  'settings-syntax': {
    sentence: 'The settings file is not readable YAML.',
    remedy: 'Mend the YAML at this place; texts with any of : # { } [ ] , & * ! | > % @ belong in quotes.',
  },
  'settings-duplicate-key': {
    sentence: 'A key stands twice.',
    remedy: 'Keep one of the two.',
  },
  'settings-unknown-key': {
    sentence: 'A key is not known.',
    remedy: 'Use one of the allowed keys, or leave it out.',
  },
  'settings-missing-key': {
    sentence: 'A key that must be given is missing.',
    remedy: 'Add the key.',
  },
  'settings-wrong-value': {
    sentence: 'A value is not allowed.',
    remedy: 'Give a value of the allowed kind.',
  },
  'settings-unknown-name': {
    sentence: 'A name refers to nothing.',
    remedy: 'Use a name that these settings define, or define it.',
  },
  'settings-conflict': {
    sentence: 'Two settings do not go together.',
    remedy: 'Change one of the two.',
  },
  'settings-variable': {
    sentence: 'A value cannot be taken from the environment.',
    remedy: 'Set the variable NAME, or let NAME_FILE name a readable file that holds the value.',
  },
  'settings-secret': {
    sentence: 'A secret is written in plain.',
    remedy:
      'Write "${NAME}" and set NAME, or NAME_FILE to a file with the secret; in plain it may stand only where all addresses concerned are loopback.',
  },
  'settings-exposed': {
    sentence: 'The page would be open to everyone.',
    remedy: 'Give page.token, as "${PAGE_TOKEN}", or listen on 127.0.0.1.',
  },
  // feeds
  'feed-file': {
    sentence: 'The readings of a feed cannot be opened or read.',
    remedy: 'Make sure that the file exists, is no folder, and may be read by the user of the monitor.',
  },
  'feed-columns': {
    sentence: 'The header line of a CSV file does not fit the format that the settings state.',
    remedy:
      'Name the columns in the settings as the first line of the file does; columns are separated by commas, and no name stands twice.',
  },
  'feed-encoding': {
    sentence: 'The text of a feed is not UTF-8.',
    remedy: 'Convert it, for example with `iconv -f UTF-16 -t UTF-8`.',
  },
  'kafka-certificate': {
    sentence: 'A file for the encrypted connection to Kafka cannot be used.',
    remedy:
      'Let tls.ca, tls.cert and tls.key name PEM files that the user of the monitor may read; cert and key go together.',
  },
  'kafka-login': {
    sentence: 'The Kafka brokers refuse the login.',
    remedy:
      'Check sasl.mechanism, sasl.username and the password, and that the user may read the topic and use the group.',
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
  // alerts
  'act-refused': {
    sentence: 'The alert does not allow this act now.',
    remedy: 'Look at the state of the alert on the page or with `tautline explain`, then choose another act.',
  },
  'alert-unknown': {
    sentence: 'There is no alert of that name.',
    remedy: 'Name an alert as the page and `tautline explain` show it: ENSEMBLE/SHIFT/START.',
  },
  'route-secret': {
    sentence: 'The secret of the webhook cannot be used.',
    remedy:
      'Give whsec_ followed by base64 of at least 24 bytes, or any plain text of at least 24 characters; the receiver needs the same.',
  },
  'route-label': {
    sentence: 'A label of the route is one that the monitor sets itself.',
    remedy:
      'Choose another name; alertname, ensemble, kind and shift tell alerts apart and cannot be changed.',
  },
  // regime
  'reference-unreadable': {
    sentence: 'The reference file cannot be used.',
    remedy: 'Write it anew with `tautline explain --reference`, or give another kind of reference.',
  },
  'limit-unknown': {
    sentence: 'An explicit limit names a statistic that does not exist.',
    remedy: 'Use leading-share, spectral-distance, frobenius or partner-distance.',
  },
  // commands
  'signals-unreadable': {
    sentence: 'A file that the settings name for an ensemble cannot be used.',
    remedy:
      'Give a readable file: for `signals`, one name a line; for `reference`, as `explain --reference` writes it.',
  },
  'report-unwritten': {
    sentence: 'The report cannot be written.',
    remedy: 'Give --report a path in a folder that exists and may be written to.',
  },
  // page
  'page-unopened': {
    sentence: 'The page cannot listen on its address.',
    remedy:
      'Give another page.listen (for the demo --port), or end what listens there already; EADDRINUSE means that something does.',
  },
  'page-unbuilt': {
    sentence: 'The browser part of the page is missing.',
    remedy: 'Run `npm run build`.',
  },
  // command line
  'nothing-to-explain': {
    sentence: 'The store holds nothing of that name.',
    remedy: 'Run `tautline explain` without a name for a list of what there is.',
  },
  'store-missing': {
    sentence: 'There is no store yet.',
    remedy: 'Run `tautline watch` with the same settings first; store.path names the file.',
  },
  defect: {
    sentence: 'The monitor has a defect.',
    remedy: 'Please report it with these lines; --log-level debug adds where it happened.',
  },
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
