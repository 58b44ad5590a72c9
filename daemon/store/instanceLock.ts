import { chmodSync } from 'node:fs';
import Database from 'better-sqlite3';

/**
 * One writer a state folder: a small database of its own, held in an exclusive transaction. The kernel frees it when the
 * process dies, however it dies, so that no stale lock is ever left behind. Its user_version is the mark that a record was
 * made in this folder: a record that is gone later is a fault, not a first start.
 */
export interface InstanceLock {
  readonly recordWasMade: boolean;
  markRecordMade(): void;
  release(): void;
}

/** Null: another process holds it. */
export function takeInstanceLock(file: string): InstanceLock | null {
  const db = new Database(file, { timeout: 0 });
  try {
    chmodSync(file, 0o600);
    db.exec('BEGIN EXCLUSIVE');
  } catch (error) {
    db.close();
    if (error instanceof Database.SqliteError && error.code.startsWith('SQLITE_BUSY')) return null;
    throw error;
  }
  return {
    recordWasMade: db.pragma('user_version', { simple: true }) === 1,
    markRecordMade() {
      db.pragma('user_version = 1');
      db.exec('COMMIT; BEGIN EXCLUSIVE');
    },
    release: () => db.close(),
  };
}
