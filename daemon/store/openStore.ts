import { statSync } from 'node:fs';
import { connect, type Db, ForeignDatabase, UnsuitableLibrary } from './connection.ts';
import { type InstanceLock, takeInstanceLock } from './instanceLock.ts';
import { migrate, SCHEMA_VERSION, schemaVersion } from './migrations.ts';
import { requeueCutOff } from './outbox.ts';
import type { OpenFailure } from './shapes.ts';
import { folderProblem, lockFile, placeOf, prepareFolder, recordFile } from './stateFolder.ts';
import { Store } from './store.ts';
import { storageTrouble } from './trouble.ts';

export type Opened =
  | { readonly ok: true; readonly store: Store }
  | { readonly ok: false; readonly failure: OpenFailure };

export interface OpenOptions {
  /** `daemon`: the one writer (watch, replay). `reader`: looks, and records verdicts, beside a daemon or without one. */
  readonly mode: 'daemon' | 'reader';
}

/** Opens the record of a state folder; the daemon makes it at its first start. Expected failures are values. */
export function openStore(folder: string, { mode }: OpenOptions): Opened {
  let lock: InstanceLock | null = null;
  let db: Db | null = null;
  try {
    const problem = mode === 'daemon' ? prepareFolder(folder) : folderProblem(folder);
    if (problem !== null) return { ok: false, failure: problem };
    if (mode === 'daemon') {
      lock = takeInstanceLock(lockFile(folder));
      if (lock === null) return refuse(lock, db, heldByAnother(folder));
    }
    const absent = absenceProblem(folder, lock);
    if (absent !== null) return refuse(lock, db, absent);

    db = connect(recordFile(folder), { mustExist: lock === null });
    const unfit = recordProblem(db, folder, lock);
    if (unfit !== null) return refuse(lock, db, unfit);
    if (lock !== null) {
      migrate(db);
      requeueCutOff(db);
      if (!lock.recordWasMade) lock.markRecordMade();
    }
    return { ok: true, store: new Store(db, lock, placeOf(recordFile(folder))) };
  } catch (error) {
    return refuse(lock, db, failureFrom(error, folder));
  }
}

function refuse(lock: InstanceLock | null, db: Db | null, failure: OpenFailure): Opened {
  db?.close();
  lock?.release();
  return { ok: false, failure };
}

export function heldByAnother(folder: string): OpenFailure {
  return {
    kind: 'held by another instance',
    message: `${folder}: another instance holds this state folder. Stop it first, or give this one a folder of its own.`,
  };
}

/** A record that is gone is not made anew in silence: every event in the feeds would be found and mailed once more. */
function absenceProblem(folder: string, lock: InstanceLock | null): OpenFailure | null {
  const file = recordFile(folder);
  const size = statSync(file, { throwIfNoEntry: false })?.size ?? 0;
  if (size > 0 || (lock !== null && !lock.recordWasMade)) return null;
  return lock === null ? nothingYet(file) : goneOrEmpty(folder);
}

function recordProblem(db: Db, folder: string, lock: InstanceLock | null): OpenFailure | null {
  const version = schemaVersion(db);
  if (db.prepare('SELECT count(*) FROM sqlite_schema').pluck().get() === 0) {
    if (lock === null) return nothingYet(db.name);
    return lock.recordWasMade ? goneOrEmpty(folder) : null;
  }
  if (version > SCHEMA_VERSION) {
    return {
      kind: 'newer schema',
      message: `${db.name}: written by a newer version (schema ${version}; this one knows ${SCHEMA_VERSION}). Use that version.`,
    };
  }
  if (lock === null) {
    if (version === SCHEMA_VERSION) return null;
    return {
      kind: 'older schema',
      message: `${db.name}: schema ${version} of an older version. Start the daemon once first.`,
    };
  }
  if (statSync(recordFile(folder)).size > CHECKED_AT_START_BYTES) return null;
  const check = db.pragma('quick_check(1)', { simple: true });
  return check === 'ok' ? null : damaged(folder, String(check));
}

/** To go through all of a larger record takes longer than a start should: the daily check does it beside the running daemon. */
const CHECKED_AT_START_BYTES = 256e6;

function nothingYet(file: string): OpenFailure {
  return { kind: 'nothing on record', message: `${file}: nothing is on record yet; the daemon has not run.` };
}

function goneOrEmpty(folder: string): OpenFailure {
  return damaged(folder, 'the record that was kept here is gone or empty');
}

function damaged(folder: string, what: string): OpenFailure {
  return {
    kind: 'damaged',
    message: `${recordFile(folder)}: ${what}. Nothing was changed. Bring back a copy with: spinvigil restore FILE`,
  };
}

export function failureFrom(error: unknown, folder: string): OpenFailure {
  if (error instanceof UnsuitableLibrary) return { kind: 'unsuitable library', message: error.message };
  const trouble = storageTrouble(error);
  if (trouble === 'damaged' || error instanceof ForeignDatabase) return damaged(folder, (error as Error).message);
  if (trouble !== null || (error instanceof Error && 'syscall' in error)) {
    return {
      kind: 'storage fault',
      message: `${folder}: ${(error as Error).message}. Check the disk, its space and its rights.`,
    };
  }
  throw error;
}
