import type { QuarantinedRow } from '../../alerts/morningReview.ts';
import type { FileRecord } from '../records.ts';
import { type Db, rows } from './connection.ts';

/** The latest of what came in, for the page: newest first, at most `most`. */

export function recentFiles(db: Db, most: number): FileRecord[] {
  return rows<FileRecord>(
    db,
    `SELECT id, feed, path, sha256, bytes, taken_in_at AS takenInAt, row_count AS rows, stored, same, revised, quarantined,
       fault FROM files ORDER BY id DESC LIMIT ?`,
    most,
  );
}

/** Without that of files which were delivered again since: their newer revision says what is wrong now. */
export function recentQuarantine(db: Db, most: number): QuarantinedRow[] {
  return rows<QuarantinedRow>(
    db,
    `SELECT f.feed, f.path AS file, q.line, q.reason, q.at FROM quarantine q JOIN files f ON f.id = q.file_id
     WHERE NOT EXISTS (SELECT 1 FROM files n
       WHERE n.feed = f.feed AND n.path_bytes = f.path_bytes AND n.revision > f.revision)
     ORDER BY q.id DESC LIMIT ?`,
    most,
  );
}
