import Database from 'better-sqlite3';

/**
 * What kind of trouble the database reported, by family and not by single code: a full disk may show itself as SQLITE_FULL,
 * as a failed write or as a failed sync.
 *
 * - `busy`: another connection held it too long. Try again.
 * - `full`: no space, or a file system that became read-only. Pause the intake; nothing is lost.
 * - `fault`: reading, writing or syncing failed. Acknowledge nothing more, stop, start again.
 * - `damaged`: the file is not what we wrote. Stop; restore a backup.
 */
export type StorageTrouble = 'busy' | 'full' | 'fault' | 'damaged';

/** Null: not trouble of the storage but a fault of the program. */
export function storageTrouble(error: unknown): StorageTrouble | null {
  if (!(error instanceof Database.SqliteError)) return null;
  const { code } = error;
  if (code.startsWith('SQLITE_BUSY') || code.startsWith('SQLITE_LOCKED')) return 'busy';
  if (code.startsWith('SQLITE_FULL') || code.startsWith('SQLITE_READONLY') || code === 'SQLITE_IOERR_SHMSIZE')
    return 'full';
  if (code.startsWith('SQLITE_IOERR') || code.startsWith('SQLITE_CANTOPEN') || code === 'SQLITE_PERM') return 'fault';
  if (code.startsWith('SQLITE_CORRUPT') || code.startsWith('SQLITE_NOTADB')) return 'damaged';
  return null;
}
