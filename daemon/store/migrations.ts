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
