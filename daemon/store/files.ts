import { type Db, inTransaction, row, run } from './connection.ts';
import type { KnownFile, NewFile, QuarantinedLine } from './shapes.ts';

/** Files and their revisions, what of them is quarantined, and which were begun but never finished. */

interface FileRow {
  id: number;
  feed: string;
  path: string;
  revision: number;
  sha256: string;
  bytes: number;
  signature: string;
  taken_in_at: string;
  row_count: number;
  stored: number;
  same: number;
  revised: number;
  quarantined: number;
  fault: string | null;
}

export function knownFile(db: Db, feed: string, path: string | { readonly bytesHex: string }): KnownFile | null {
  const found = row<FileRow>(
    db,
    'SELECT * FROM files WHERE feed = ? AND path_bytes = ? ORDER BY revision DESC LIMIT 1',
    feed,
    pathBytes(path),
  );
  if (found === undefined) return null;
  const { taken_in_at: takenInAt, row_count: rows, ...same } = found;
  return {
    id: same.id,
    feed: same.feed,
    path: same.path,
    revision: same.revision,
    sha256: same.sha256,
    bytes: same.bytes,
    signature: same.signature,
    takenInAt,
    rows,
    stored: same.stored,
    same: same.same,
    revised: same.revised,
    quarantined: same.quarantined,
    fault: same.fault,
  };
}

/** The identity of a path: its bytes. */
export function pathBytes(path: string | { readonly bytesHex: string }): string {
  return typeof path === 'string' ? Buffer.from(path, 'utf8').toString('hex') : path.bytesHex.toLowerCase();
}

export function noteUnchanged(db: Db, fileId: number, signature: string): void {
  const { changes } = run(db, 'UPDATE files SET signature = ? WHERE id = ?', signature, fileId);
  if (changes !== 1) throw new Error(`There is no file ${fileId} on record.`);
}

export function noteReadingStarts(
  db: Db,
  feed: string,
  path: string | { readonly bytesHex: string },
  sha256: string,
): number {
  return inTransaction(db, () => {
    const begun = row<{ times: number }>(
      db,
      `INSERT INTO readings_begun (feed, path_bytes, sha256, times) VALUES (?, ?, ?, 1)
       ON CONFLICT (feed, path_bytes) DO UPDATE SET
         times = CASE WHEN sha256 = excluded.sha256 THEN times + 1 ELSE 1 END,
         sha256 = excluded.sha256
       RETURNING times`,
      feed,
      pathBytes(path),
      sha256,
    );
    return begun!.times;
  });
}

export interface RowCounts {
  readonly stored: number;
  readonly same: number;
  readonly revised: number;
  readonly quarantined: number;
}

/** Adds the next revision of the path; a readable one takes the place of the one that stood. */
export function insertFile(db: Db, file: NewFile, counts: RowCounts, at: string): number {
  const accounted = counts.stored + counts.same + counts.revised + counts.quarantined;
  if (file.rows !== accounted) {
    throw new Error(`${file.feed}/${file.path}: ${file.rows} rows were read but ${accounted} are accounted for.`);
  }
  const bytes = pathBytes(file.pathBytesHex === undefined ? file.path : { bytesHex: file.pathBytesHex });
  const last = row<{ revision: number | null }>(
    db,
    'SELECT max(revision) AS revision FROM files WHERE feed = ? AND path_bytes = ?',
    file.feed,
    bytes,
  );
  if (file.fault === null) {
    run(db, 'UPDATE files SET standing = 0 WHERE feed = ? AND path_bytes = ? AND standing = 1', file.feed, bytes);
  }
  run(db, 'DELETE FROM readings_begun WHERE feed = ? AND path_bytes = ?', file.feed, bytes);
  const { lastInsertRowid } = run(
    db,
    `INSERT INTO files (feed, path, path_bytes, revision, standing, sha256, bytes, signature, taken_in_at,
       row_count, stored, same, revised, quarantined, fault)
     VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?)`,
    file.feed,
    file.path,
    bytes,
    (last?.revision ?? 0) + 1,
    file.fault === null ? 1 : 0,
    file.sha256,
    file.bytes,
    file.signature,
    at,
    file.rows,
    counts.stored,
    counts.same,
    counts.revised,
    counts.quarantined,
    file.fault,
  );
  return Number(lastInsertRowid);
}

export function insertQuarantined(db: Db, fileId: number, lines: readonly QuarantinedLine[], at: string): void {
  const insert = 'INSERT INTO quarantine (file_id, line, pulsar, reason, at) VALUES (?, ?, ?, ?, ?)';
  for (const { line, pulsar = null, reason } of lines) run(db, insert, fileId, line, pulsar, reason, at);
}
