import type { QuarantinedRow } from '../../alerts/morningReview.ts';
import type { FileRecord } from '../records.ts';
import { type Db, rows } from './connection.ts';

/** The latest of what came in, newest first. */

export function recentFiles(db: Db, most: number): FileRecord[] {
  return rows<FileRecord>(
    db,
    `SELECT id, feed, path, sha256, bytes, taken_in_at AS takenInAt, row_count AS rows, stored, same, revised, quarantined,
       fault FROM files ORDER BY id DESC LIMIT ?`,
    most,
  );
}

/** Files that were delivered again since are left out: their newer revision says what is wrong now. */
const STANDING_QUARANTINE = `SELECT f.feed, f.path AS file, q.line, q.reason, q.at
  FROM quarantine q JOIN files f ON f.id = q.file_id
  WHERE NOT EXISTS (SELECT 1 FROM files n
    WHERE n.feed = f.feed AND n.path_bytes = f.path_bytes AND n.revision > f.revision)`;

export function recentQuarantine(db: Db, most: number): QuarantinedRow[] {
  return rows<QuarantinedRow>(db, `${STANDING_QUARANTINE} ORDER BY q.id DESC LIMIT ?`, most);
}

/** The rows that name a pulsar; of those taken in before the record knew, none. */
export function quarantineOf(db: Db, pulsar: string): QuarantinedRow[] {
  return rows<QuarantinedRow>(db, `${STANDING_QUARANTINE} AND q.pulsar = ? ORDER BY q.id DESC`, pulsar);
}
