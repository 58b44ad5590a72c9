import type { QuarantinedRow } from '../../alerts/morningReview.ts';
import type { EventState, PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import { type Db, row, rows } from './connection.ts';
import { fromJson } from './json.ts';
import type { EventChangeLine } from './shapes.ts';

/** What the morning review is made of. */

export function quarantinedSince(db: Db, since: string): QuarantinedRow[] {
  return rows<QuarantinedRow>(
    db,
    `SELECT f.feed, f.path AS file, q.line, q.reason, q.at FROM quarantine q JOIN files f ON f.id = q.file_id
     WHERE q.at >= ? ORDER BY q.id`,
    since,
  );
}

/** Files that could not be read, or of whose rows more than half could not be used. */
export interface UnusableFile {
  readonly feed: string;
  readonly path: string;
  readonly rows: number;
  readonly quarantined: number;
  /** Null: it was read. */
  readonly fault: string | null;
  readonly takenInAt: string;
}

export function unusableFilesSince(db: Db, since: string): UnusableFile[] {
  return rows<UnusableFile>(
    db,
    `SELECT feed, path, row_count AS rows, quarantined, fault, taken_in_at AS takenInAt FROM files
     WHERE (fault IS NOT NULL OR quarantined * 2 > row_count) AND taken_in_at >= ? ORDER BY id`,
    since,
  );
}

export function intakeSince(db: Db, since: string): { files: number; arrivals: number; pulsars: number } {
  return row<{ files: number; arrivals: number; pulsars: number }>(
    db,
    `SELECT count(*) AS files, coalesce(sum(stored + revised), 0) AS arrivals, (
       SELECT count(DISTINCT pulsar) FROM arrivals a JOIN files f ON f.id = a.file_id WHERE f.taken_in_at >= @since
     ) AS pulsars FROM files WHERE taken_in_at >= @since AND fault IS NULL`,
    { since },
  )!;
}

export function eventChangesSince(db: Db, since: string): EventChangeLine[] {
  return rows<{ body: string; state: EventState; what: string; alert: string | null; at: string; isFirst: number }>(
    db,
    `SELECT e.body, e.state, c.what, c.alert, c.at, c.revision = 1 AS isFirst
     FROM event_changes c JOIN events e ON e.id = c.event_id
     WHERE c.at >= ? ORDER BY c.at DESC, e.id, c.revision DESC`,
    since,
  ).map(({ body, state, isFirst, ...line }) => ({
    event: { ...fromJson<PulsarEvent>(body), state },
    ...line,
    isFirst: isFirst === 1,
  }));
}

/** A file that could not be read (without a signature) is no sign of life. */
export function lastFileByFeed(db: Db): Map<string, string> {
  const found = rows<{ feed: string; at: string }>(
    db,
    "SELECT feed, max(taken_in_at) AS at FROM files WHERE signature <> '' GROUP BY feed ORDER BY feed",
  );
  return new Map(found.map(({ feed, at }) => [feed, at]));
}

export function lastArrivalByPulsar(db: Db): Map<string, number> {
  const found = rows<{ pulsar: string; mjd: number }>(
    db,
    `SELECT a.pulsar, max(b.tdb_day + b.tdb_fraction) AS mjd FROM arrivals a JOIN barycentred b ON b.arrival_id = a.id
     WHERE a.status = 'live' GROUP BY a.pulsar ORDER BY a.pulsar`,
  );
  return new Map(found.map(({ pulsar, mjd }) => [pulsar, mjd]));
}
