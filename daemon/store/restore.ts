import { existsSync, renameSync, statSync } from 'node:fs';
import { join, resolve } from 'node:path';
import Database from 'better-sqlite3';
import { copyProblem, removeDatabase, UnsoundCopy, writeCopySync } from './backup.ts';
import { connect, type Db, ForeignDatabase, inTransaction } from './connection.ts';
import { step } from './crashStep.ts';
import { type InstanceLock, takeInstanceLock } from './instanceLock.ts';
import { SCHEMA_VERSION, schemaVersion } from './migrations.ts';
import { failureFrom, heldByAnother } from './openStore.ts';
import type { OpenFailure } from './shapes.ts';
import { lockFile, prepareFolder, recordFile } from './stateFolder.ts';
import { storageTrouble } from './trouble.ts';

export type Restored =
  /** `keptAside`: the record that was there before; null: there was none. */
  { readonly ok: true; readonly keptAside: string | null } | { readonly ok: false; readonly failure: OpenFailure };

interface Delivered {
  readonly message_id: string;
  readonly recipient: string;
  readonly subject: string;
  readonly delivered_at: string;
}

/**
 * Brings a copy back. The present record is kept aside, and the copy flows into its place through SQLite, as one transaction:
 * a command that has it open sees the old or the new, and a crash leaves the old. What was mailed since the copy was
 * made is remembered in it beforehand, so that it is not mailed again. `at` (ISO 8601 UTC) names what is kept aside.
 */
export async function restore(copyFile: string, folder: string, at: string): Promise<Restored> {
  let lock: InstanceLock | null = null;
  try {
    const problem = prepareFolder(folder) ?? sourceProblem(copyFile, recordFile(folder));
    if (problem !== null) return { ok: false, failure: problem };
    lock = takeInstanceLock(lockFile(folder));
    if (lock === null) return { ok: false, failure: heldByAnother(folder) };

    const aside = join(folder, `before-restore-${at.replaceAll(/[^0-9TZ]/g, '')}.db`);
    const { keptAside, delivered } = keepAside(recordFile(folder), aside);
    step('record kept aside');
    const staged = join(folder, 'restoring.db');
    removeDatabase(staged);
    await copyInto(copyFile, staged);
    settleMail(staged, delivered);
    step('copy staged');
    await copyInto(staged, recordFile(folder));
    forceLogToDisk(recordFile(folder));
    step('copy in place');
    removeDatabase(staged);
    if (!lock.recordWasMade) lock.markRecordMade();
    return { ok: true, keptAside };
  } catch (error) {
    return { ok: false, failure: failureFrom(error, folder) };
  } finally {
    lock?.release();
  }
}

/** A copy is trusted only when all of it checks and this version can read it. */
function sourceProblem(copyFile: string, record: string): OpenFailure | null {
  const refuse = (what: string): OpenFailure => ({
    kind: 'damaged',
    message: `${copyFile}: ${what}. Nothing was changed.`,
  });
  if (resolve(copyFile) === resolve(record)) return refuse('this is the record itself, not a copy of it');
  if (!statSync(copyFile, { throwIfNoEntry: false })?.isFile()) return refuse('there is no such file');
  try {
    const copy = new Database(copyFile, { readonly: true, fileMustExist: true });
    try {
      const problem = copyProblem(copy);
      if (problem !== null) return refuse(problem);
      if (schemaVersion(copy) <= SCHEMA_VERSION) return null;
      return {
        kind: 'newer schema',
        message: `${copyFile}: written by a newer version. Use that version to restore it.`,
      };
    } finally {
      copy.close();
    }
  } catch (error) {
    if (storageTrouble(error) === 'damaged') return refuse((error as Error).message);
    throw error;
  }
}

function keepAside(file: string, aside: string): { keptAside: string | null; delivered: readonly Delivered[] } {
  if (!existsSync(file)) return { keptAside: null, delivered: [] };
  let present: Db | null = null;
  try {
    present = connect(file, { mustExist: true });
    const delivered = schemaVersion(present) === 0 ? [] : deliveredIn(present);
    writeCopySync(present, aside);
    return { keptAside: aside, delivered };
  } catch (error) {
    present?.close();
    const ruined =
      error instanceof ForeignDatabase || error instanceof UnsoundCopy || storageTrouble(error) === 'damaged';
    if (!ruined) throw error;
    moveAside(file, aside);
    return { keptAside: aside, delivered: [] };
  } finally {
    present?.close();
  }
}

/** For a record that cannot be read any more: nobody can lose by it. The log goes with its database. */
function moveAside(file: string, aside: string): void {
  for (const suffix of ['-wal', '-shm', '']) {
    if (existsSync(file + suffix)) renameSync(file + suffix, aside + suffix);
  }
}

function deliveredIn(present: Db): Delivered[] {
  return present
    .prepare(
      `SELECT message_id, recipient, subject, delivered_at FROM outbox JOIN messages USING (message_id) WHERE state = 'delivered'
       UNION SELECT message_id, recipient, subject, delivered_at FROM delivered_before`,
    )
    .all() as Delivered[];
}

/** Page by page, as one transaction of the target, whoever has it open. */
async function copyInto(from: string, to: string): Promise<void> {
  const source = new Database(from, { readonly: true, fileMustExist: true });
  try {
    await source.backup(to);
  } finally {
    source.close();
  }
}

/** What the old record delivered counts as delivered; what waits in the copy may have left since, and says so. */
function settleMail(file: string, delivered: readonly Delivered[]): void {
  const db = connect(file, { mustExist: true });
  try {
    inTransaction(db, () => {
      const remember = db.prepare(
        'INSERT OR IGNORE INTO delivered_before VALUES (@message_id, @recipient, @subject, @delivered_at)',
      );
      for (const one of delivered) remember.run({ ...one });
      db.exec(`
        UPDATE outbox SET state = 'delivered', last_error = NULL, delivered_at = (
            SELECT delivered_at FROM delivered_before d WHERE d.message_id = outbox.message_id AND d.recipient = outbox.recipient)
          WHERE state IN ('queued', 'attempting') AND EXISTS (
            SELECT 1 FROM delivered_before d WHERE d.message_id = outbox.message_id AND d.recipient = outbox.recipient);
        UPDATE outbox SET possible_duplicate = 1 WHERE state IN ('queued', 'attempting');`);
      endSessions(db);
    });
  } finally {
    db.close();
  }
}

/** Who logged out since the copy was made stays out; a copy of an older schema knows no sessions. */
function endSessions(db: Db): void {
  const known = db.prepare("SELECT 1 FROM sqlite_schema WHERE name = 'sessions'").get();
  if (known !== undefined) db.exec('DELETE FROM sessions');
}

function forceLogToDisk(file: string): void {
  const db = connect(file, { mustExist: true });
  try {
    db.pragma('wal_checkpoint(TRUNCATE)');
  } finally {
    db.close();
  }
}
