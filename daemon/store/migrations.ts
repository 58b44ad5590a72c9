import { dirname, join } from 'node:path';
import { writeCopySync } from './backup.ts';
import { APPLICATION_ID, type Db, inTransaction } from './connection.ts';
import { step } from './crashStep.ts';
import { FIRST_SCHEMA } from './schema.ts';

/** One step from a schema to the next. Append only: a released step is never edited. */
export interface Migration {
  readonly name: string;
  readonly sql: string;
}

export const MIGRATIONS: readonly Migration[] = [
  { name: 'first schema', sql: FIRST_SCHEMA },
  {
    name: 'whose a quarantined row would have been',
    sql: `ALTER TABLE quarantine ADD COLUMN pulsar TEXT;
CREATE INDEX quarantine_by_pulsar ON quarantine (pulsar) WHERE pulsar IS NOT NULL;`,
  },
  {
    name: 'who is logged in; verdicts that nothing can change',
    sql: `CREATE TABLE sessions (
  -- SHA-256 of the token that the visitor holds.
  id TEXT PRIMARY KEY,
  reviewer TEXT NOT NULL,
  started_at TEXT NOT NULL,
  expires_at TEXT NOT NULL,
  CHECK (expires_at > started_at)
) STRICT, WITHOUT ROWID;
CREATE INDEX sessions_by_reviewer ON sessions (reviewer);
-- The event's id may change with late data, and is no part of what was signed.
CREATE TRIGGER verdicts_stand BEFORE UPDATE OF id, verdict, reviewer, note, at, revision ON verdicts
BEGIN SELECT RAISE(ABORT, 'verdicts are never changed'); END;
CREATE TRIGGER verdicts_are_added BEFORE INSERT ON verdicts
WHEN EXISTS (SELECT 1 FROM verdicts WHERE id = NEW.id OR (event_id = NEW.event_id AND revision = NEW.revision))
BEGIN SELECT RAISE(ABORT, 'verdicts are never replaced'); END;`,
  },
  {
    name: 'why a revision was mailed or not',
    sql: 'ALTER TABLE event_changes ADD COLUMN alert TEXT;',
  },
  {
    name: 'from when on a message may leave, and when it was given up',
    sql: `ALTER TABLE messages ADD COLUMN may_leave_at TEXT;
UPDATE messages SET may_leave_at = created_at;
ALTER TABLE outbox ADD COLUMN given_up_at TEXT;
CREATE INDEX files_mostly_unusable ON files (taken_in_at) WHERE fault IS NOT NULL OR quarantined * 2 > row_count;`,
  },
  {
    name: 'what pulsars say of the clocks of their sites',
    sql: 'ALTER TABLE pulsar_reports ADD COLUMN times TEXT CHECK (times IS NULL OR json_valid(times));',
  },
  {
    name: 'each attempt at each mail',
    sql: `CREATE TABLE mail_attempts (
  outbox_id INTEGER NOT NULL REFERENCES outbox (id) ON DELETE CASCADE,
  number INTEGER NOT NULL CHECK (number >= 1),
  begun_at TEXT NOT NULL,
  -- Null: under way.
  outcome TEXT,
  PRIMARY KEY (outbox_id, number)
) STRICT, WITHOUT ROWID;`,
  },
  {
    name: 'when a feed delivered last, without going through its files',
    sql: "CREATE INDEX files_of_feed_by_time ON files (feed, taken_in_at) WHERE signature <> '';",
  },
];

export const SCHEMA_VERSION = MIGRATIONS.length;

export function schemaVersion(db: Db): number {
  return db.pragma('user_version', { simple: true }) as number;
}

/**
 * Brings the record to the newest schema, each step in a transaction of its own with its version number, so that a crash
 * leaves one schema or the other. A record that holds something is copied first, beside itself.
 */
export function migrate(db: Db, migrations: readonly Migration[] = MIGRATIONS): void {
  const from = schemaVersion(db);
  if (from > 0 && from < migrations.length) {
    writeCopySync(db, join(dirname(db.name), `before-schema-${migrations.length}.db`));
    step('copied before migration');
  }
  for (let version = from; version < migrations.length; version += 1) {
    inTransaction(db, () => {
      db.exec(migrations[version]!.sql);
      step('migration applied');
      db.pragma(`application_id = ${APPLICATION_ID}`);
      db.pragma(`user_version = ${version + 1}`);
      step('migration numbered');
    });
  }
}
