/** Marks the file as ours in the header of SQLite's file format: the letters `TAUT`. */
export const applicationId = 0x54415554

/** Kinds of journal entries of which the oldest may give way; the others are kept for good. */
export const prunableKinds = ['delivery', 'run'] as const

const prunable = prunableKinds.map((kind) => `'${kind}'`).join(', ')

/**
 * The steps from one schema to the next: `migrations[v]` leads from version v (kept in `user_version`) to
 * v + 1. A step that was published is never changed again.
 */
export const migrations: readonly string[] = [
  `
  CREATE TABLE checkpoint (
    only INTEGER PRIMARY KEY CHECK (only = 1),
    saved_at REAL NOT NULL,
    sealed BLOB NOT NULL
  ) STRICT;

  CREATE TABLE outbox (
    key TEXT PRIMARY KEY,
    route TEXT NOT NULL,
    alert TEXT NOT NULL,
    version INTEGER NOT NULL,
    created REAL NOT NULL,
    attempts INTEGER NOT NULL,
    not_before REAL NOT NULL,
    give_up_at REAL NOT NULL,
    last_error TEXT,
    payload TEXT NOT NULL
  ) STRICT, WITHOUT ROWID;
  CREATE INDEX outbox_order ON outbox (route, alert, version);

  CREATE TABLE journal (
    seq INTEGER PRIMARY KEY AUTOINCREMENT,
    time REAL NOT NULL,
    kind TEXT NOT NULL,
    ensemble TEXT,
    body TEXT NOT NULL
  ) STRICT;
  CREATE INDEX journal_kind ON journal (kind, seq);
  CREATE INDEX journal_ensemble ON journal (ensemble, seq);
  CREATE TRIGGER journal_keeps BEFORE DELETE ON journal WHEN OLD.kind NOT IN (${prunable})
  BEGIN SELECT RAISE(ABORT, 'the journal is append-only'); END;
  CREATE TRIGGER journal_stays BEFORE UPDATE ON journal
  BEGIN SELECT RAISE(ABORT, 'the journal is append-only'); END;

  CREATE TABLE alert (
    id TEXT PRIMARY KEY,
    saved INTEGER NOT NULL UNIQUE,
    open INTEGER NOT NULL,
    body TEXT NOT NULL
  ) STRICT, WITHOUT ROWID;

  CREATE TABLE quarantine (
    seq INTEGER PRIMARY KEY AUTOINCREMENT,
    body TEXT NOT NULL
  ) STRICT;
  `,
]

export const schemaVersion = migrations.length
