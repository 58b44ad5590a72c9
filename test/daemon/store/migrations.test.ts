import { existsSync, readdirSync } from 'node:fs';
import { join } from 'node:path';
import Database from 'better-sqlite3';
import { afterEach, beforeEach, expect, test } from 'vitest';
import { APPLICATION_ID, connect } from '../../../daemon/store/connection.ts';
import { MIGRATIONS, type Migration, migrate, schemaVersion } from '../../../daemon/store/migrations.ts';
import { verify } from '../../../daemon/store/verify.ts';
import { fileBatch, open, temporaryFolder } from './sample.ts';

let folder: ReturnType<typeof temporaryFolder>;
beforeEach(() => {
  folder = temporaryFolder();
});
afterEach(() => folder.remove());

const file = () => join(folder.path, 'record.db');
const SECOND: Migration = {
  name: 'second',
  sql: "ALTER TABLE files ADD COLUMN origin TEXT NOT NULL DEFAULT 'unknown'",
};

test('C10: a record with data goes to the next schema, and a checked copy of the old one stays', () => {
  const store = open(folder.path);
  store.commitIntake(fileBatch(0, 3));
  store.close();

  const db = connect(file(), { mustExist: true });
  migrate(db, [...MIGRATIONS, SECOND]);
  expect(schemaVersion(db)).toBe(MIGRATIONS.length + 1);
  expect(db.prepare('SELECT origin FROM files').pluck().get()).toBe('unknown');
  expect(db.prepare('SELECT count(*) FROM arrivals').pluck().get()).toBe(3);
  db.close();

  const copy = new Database(join(folder.path, `before-schema-${MIGRATIONS.length + 1}.db`), { readonly: true });
  expect(schemaVersion(copy)).toBe(MIGRATIONS.length);
  expect(copy.pragma('integrity_check', { simple: true })).toBe('ok');
  expect(copy.prepare('SELECT count(*) FROM arrivals').pluck().get()).toBe(3);
  copy.close();
});

test('C8: a step that fails half-way leaves the old schema', () => {
  open(folder.path).close();
  const db = connect(file(), { mustExist: true });
  const broken: Migration = { name: 'broken', sql: `${SECOND.sql}; CREATE TABLE files (x INTEGER) STRICT;` };
  expect(() => migrate(db, [...MIGRATIONS, broken])).toThrow(/files/);
  expect(schemaVersion(db)).toBe(MIGRATIONS.length);
  expect(verify(db)).toEqual([]);
  migrate(db, [...MIGRATIONS, SECOND]);
  expect(schemaVersion(db)).toBe(MIGRATIONS.length + 1);
  db.close();
});

test('steps that are done are not done again, and a new record needs no copy', () => {
  const db = connect(file(), { mustExist: false });
  migrate(db, [...MIGRATIONS, SECOND]);
  migrate(db, [...MIGRATIONS, SECOND]);
  expect(schemaVersion(db)).toBe(MIGRATIONS.length + 1);
  expect(db.pragma('application_id', { simple: true })).toBe(APPLICATION_ID);
  expect(readdirSync(folder.path).filter((name) => name.startsWith('before-'))).toEqual([]);
  db.close();
  expect(existsSync(file())).toBe(true);
});

test('a record of an older schema is not opened by a reader', async () => {
  const { openStore } = await import('../../../daemon/store/index.ts');
  open(folder.path).close();
  const db = new Database(file());
  db.pragma(`user_version = ${MIGRATIONS.length - 1}`);
  db.close();
  expect(openStore(folder.path, { mode: 'reader' })).toMatchObject({ ok: false, failure: { kind: 'older schema' } });
});

test('C10: quarantined rows of the first schema stay, and those to come can name their pulsar', () => {
  const db = connect(file(), { mustExist: false });
  migrate(db, MIGRATIONS.slice(0, 1));
  db.exec(`INSERT INTO files VALUES (1, 'nightly', 'a.csv', '61', 1, 1, 'x', 1, 'x', '2026-03-01T06:00:00.000Z', 1, 0, 0, 0, 1, NULL);
    INSERT INTO quarantine (file_id, line, reason, at) VALUES (1, 2, 'site: unknown', '2026-03-01T06:00:00.000Z');`);
  migrate(db);
  expect(schemaVersion(db)).toBe(MIGRATIONS.length);
  expect(verify(db)).toEqual([]);
  db.close();

  const store = open(folder.path);
  store.commitIntake({
    ...fileBatch(0, 1, { rows: 2 }),
    quarantined: [{ line: 9, pulsar: 'KR 1', reason: 'no time' }],
  });
  expect(store.recentQuarantine(9).map(({ line }) => line)).toEqual([9, 2]);
  expect(store.quarantineOf('KR 1').map(({ line }) => line)).toEqual([9]);
  store.close();
});
