import { chmodSync } from 'node:fs';
import Database from 'better-sqlite3';

/** A connection with the settings that our promises rest on. Nothing else in the program opens a database file, by any means:
 * a single `fs` open and close of it would silently drop the locks of the process (POSIX advisory locks). */
export type Db = Database.Database;

/** 'SPVL' in ASCII: tells our files from other databases. */
export const APPLICATION_ID = 0x5350564c;

/** Older libraries can corrupt a write-ahead log that two connections reset at once (SQLite release notes, 3.51.3). */
const OLDEST_LIBRARY = '3.51.3';

/** How long to wait for another connection's transaction; they are short. */
const BUSY_TIMEOUT_MS = 10_000;
const JOURNAL_SIZE_LIMIT_BYTES = 64 * 1024 * 1024;
const FULL = 2;

export class UnsuitableLibrary extends Error {}

/** A database that is not ours: it is left exactly as it was. */
export class ForeignDatabase extends Error {}

/** Opens read-write with write-ahead log, full synchronisation and foreign keys, and makes sure that they are on. */
export function connect(file: string, options: { readonly mustExist: boolean }): Db {
  const db = new Database(file, { timeout: BUSY_TIMEOUT_MS, fileMustExist: options.mustExist });
  try {
    chmodSync(file, 0o600);
    requireLibrary(db.prepare('SELECT sqlite_version()').pluck().get() as string);
    refuseForeign(db);
    db.pragma('trusted_schema = OFF');
    db.pragma('cell_size_check = ON');
    if (db.pragma('journal_mode = WAL', { simple: true }) !== 'wal') {
      throw new UnsuitableLibrary('The file system of the state folder does not support a write-ahead log.');
    }
    db.pragma(`journal_size_limit = ${JOURNAL_SIZE_LIMIT_BYTES}`);
    db.pragma('foreign_keys = ON');
    db.pragma('synchronous = FULL');
    requireFullSynchronisation(db);
    return db;
  } catch (error) {
    db.close();
    throw error;
  }
}

function refuseForeign(db: Db): void {
  const isEmpty = db.prepare('SELECT count(*) FROM sqlite_schema').pluck().get() === 0;
  if (!isEmpty && db.pragma('application_id', { simple: true }) !== APPLICATION_ID) {
    throw new ForeignDatabase('this is not a record of this program');
  }
}

/** The schema is read first: before that a connection may report a setting that a later access silently lowers. */
export function requireFullSynchronisation(db: Db): void {
  db.prepare('SELECT count(*) FROM sqlite_schema').get();
  const synchronous = db.pragma('synchronous', { simple: true });
  const foreignKeys = db.pragma('foreign_keys', { simple: true });
  if (synchronous !== FULL || foreignKeys !== 1) {
    throw new UnsuitableLibrary(
      `The database library did not keep its settings (synchronous ${synchronous}, foreign keys ${foreignKeys}).`,
    );
  }
}

export function requireLibrary(version: string): void {
  const have = version.split('.').map(Number);
  const need = OLDEST_LIBRARY.split('.').map(Number);
  const firstDifference = need.findIndex((part, i) => part !== (have[i] ?? 0));
  if (firstDifference >= 0 && !((have[firstDifference] ?? 0) > need[firstDifference]!)) {
    throw new UnsuitableLibrary(`SQLite ${version} is loaded; ${OLDEST_LIBRARY} or newer is needed. Run npm ci again.`);
  }
}

const preparedByConnection = new WeakMap<Db, Map<string, Database.Statement>>();

/** A statement, prepared once a connection. */
export function prepared(db: Db, sql: string): Database.Statement {
  let statements = preparedByConnection.get(db);
  if (statements === undefined) {
    statements = new Map();
    preparedByConnection.set(db, statements);
  }
  let statement = statements.get(sql);
  if (statement === undefined) {
    statement = db.prepare(sql);
    statements.set(sql, statement);
  }
  return statement;
}

/** All rows of a query, of the shape the caller names. */
export function rows<Row>(db: Db, sql: string, ...values: unknown[]): Row[] {
  return prepared(db, sql).all(...values) as Row[];
}

/** The only row of a query, or undefined. */
export function row<Row>(db: Db, sql: string, ...values: unknown[]): Row | undefined {
  return prepared(db, sql).get(...values) as Row | undefined;
}

/**
 * A common table `every` of the values of an indexed column, each once and then a null, as the column `each`: one step of the index a value,
 * where DISTINCT would go through all of it.
 */
export function eachOnce(column: string, table: string): string {
  return `WITH RECURSIVE every (each) AS (SELECT min(${column}) FROM ${table}
    UNION ALL SELECT (SELECT min(${column}) FROM ${table} WHERE ${column} > each) FROM every WHERE each IS NOT NULL)`;
}

export function run(db: Db, sql: string, ...values: unknown[]): Database.RunResult {
  return prepared(db, sql).run(...values);
}

/** Runs `work` as one transaction that takes the write lock first, so that what it reads cannot change under it. */
export function inTransaction<Result>(db: Db, work: () => Result): Result {
  return db.transaction(work).immediate();
}
