import { closeSync, fsyncSync, openSync, renameSync, rmSync } from 'node:fs';
import { dirname, resolve } from 'node:path';
import Database from 'better-sqlite3';
import { APPLICATION_ID, type Db } from './connection.ts';
import { step } from './crashStep.ts';
import { lockFile } from './stateFolder.ts';

/** The copy that was made does not check: what it was made from is damaged. */
export class UnsoundCopy extends Error {}

/**
 * Copies, made by SQLite's own means: never by reading the file, which would miss the write-ahead log and drop our locks. A
 * copy grows under a temporary name, is checked, forced to disk and only then gets its name.
 */

/** While others write. Throws when the copy cannot be made or does not check; an older file of that name then stays. */
export async function writeBackup(db: Db, file: string): Promise<void> {
  refuseOwnFile(db, file);
  const partial = startPartial(file);
  try {
    await db.backup(partial);
    finish(partial, file);
  } finally {
    removeDatabase(partial);
  }
}

/** The same for one who holds the record alone and cannot wait. */
export function writeCopySync(db: Db, file: string): void {
  const partial = startPartial(file);
  try {
    db.prepare('VACUUM INTO ?').run(partial);
    finish(partial, file);
  } finally {
    removeDatabase(partial);
  }
}

/** Made here, empty, new and for the owner alone: nobody else can plant or read it. */
function startPartial(file: string): string {
  const partial = `${file}.partial`;
  removeDatabase(partial);
  closeSync(openSync(partial, 'wx', 0o600));
  return partial;
}

/** With what SQLite may have left beside it. Only for files that nobody has open. */
export function removeDatabase(file: string): void {
  for (const suffix of ['', '-journal', '-wal', '-shm']) rmSync(file + suffix, { force: true });
}

function refuseOwnFile(db: Db, file: string): void {
  const ours = ['', '-wal', '-shm'].map((suffix) => resolve(db.name + suffix));
  if ([...ours, resolve(lockFile(dirname(db.name)))].includes(resolve(file))) {
    throw new Error(`${file} belongs to the record itself; give the copy another name.`);
  }
}

function finish(partial: string, file: string): void {
  step('copy written');
  const copy = new Database(partial, { fileMustExist: true });
  try {
    // A plain single file, without a log beside it.
    copy.pragma('journal_mode = DELETE');
    const problem = copyProblem(copy);
    if (problem !== null) throw new UnsoundCopy(`The copy ${file} is not sound: ${problem}. Nothing was kept.`);
  } finally {
    copy.close();
  }
  forceToDisk(partial);
  step('copy checked');
  renameSync(partial, file);
  forceToDisk(dirname(file));
}

/** What keeps a database from being a copy of our record; null: nothing. */
export function copyProblem(copy: Db): string | null {
  if (copy.pragma('application_id', { simple: true }) !== APPLICATION_ID) return 'it is not a record of this program';
  const check = copy.pragma('integrity_check(1)', { simple: true });
  return check === 'ok' ? null : String(check);
}

/** Only ever for files that no connection of this process has open. */
function forceToDisk(path: string): void {
  const descriptor = openSync(path, 'r');
  try {
    fsyncSync(descriptor);
  } finally {
    closeSync(descriptor);
  }
}
