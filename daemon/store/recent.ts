import type { QuarantinedRow } from '../../alerts/morningReview.ts';
import type { ArrivalOrigin, FileRecord } from '../records.ts';
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

/** Arrivals, any status, with the line that brought them, in the order in which they were received. */
export function origins(db: Db, keys: readonly string[]): ArrivalOrigin[] {
  return rows<Omit<ArrivalOrigin, 'frequencyMhz'> & { frequencyMhz: number; removed: number }>(
    db,
    `SELECT a.key, a.time_text AS timeText, a.time_scale AS timeScale, a.site, a.receiver, a.frequency_mhz AS frequencyMhz,
       a.dispersion_removed AS removed, a.uncertainty_us AS uncertaintyUs, a.status, f.feed, f.path AS file, a.line,
       f.taken_in_at AS takenInAt
     FROM arrivals a JOIN files f ON f.id = a.file_id
     WHERE a.key IN (SELECT value FROM json_each(?)) ORDER BY a.time_day, a.time_fraction, a.key`,
    JSON.stringify(keys),
  ).map(({ removed, ...origin }) => ({
    ...origin,
    frequencyMhz: removed === 1 ? Number.POSITIVE_INFINITY : origin.frequencyMhz,
  }));
}
