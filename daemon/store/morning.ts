import type { QuarantinedRow } from '../../alerts/morningReview.ts';
import type { EventState, PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import { type Db, eachOnce, row, rows } from './connection.ts';
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

/** A file that could not be read (without a signature) is no sign of life. Feed by feed by its index: the table may be long. */
export function lastFileByFeed(db: Db): Map<string, string> {
  const found = rows<{ feed: string; at: string }>(
    db,
    `${eachOnce('feed', 'files')}
     SELECT each AS feed, (SELECT max(taken_in_at) FROM files WHERE feed = each AND signature <> '') AS at
     FROM every WHERE each IS NOT NULL AND at IS NOT NULL ORDER BY feed`,
  );
  return new Map(found.map(({ feed, at }) => [feed, at]));
}

/** The time at the barycentre is within a day of the time as received, by which the arrivals are indexed. */
export function lastArrivalByPulsar(db: Db): Map<string, number> {
  const found = rows<{ pulsar: string; mjd: number }>(
    db,
    `${eachOnce('pulsar', 'arrivals')}
     SELECT each AS pulsar, (
       SELECT max(b.tdb_day + b.tdb_fraction) FROM arrivals a JOIN barycentred b ON b.arrival_id = a.id
       WHERE a.pulsar = each AND a.status = 'live' AND a.time_day >= (
         SELECT time_day FROM arrivals l JOIN barycentred t ON t.arrival_id = l.id
         WHERE l.pulsar = each AND l.status = 'live' ORDER BY time_day DESC LIMIT 1) - 1
     ) AS mjd FROM every WHERE each IS NOT NULL AND mjd IS NOT NULL ORDER BY pulsar`,
  );
  return new Map(found.map(({ pulsar, mjd }) => [pulsar, mjd]));
}

/** The last days with live arrivals of a pulsar, MJD as received, in order of time. */
export function lastDays(db: Db, pulsar: string, most: number): number[] {
  const found = rows<{ day: number }>(
    db,
    `SELECT DISTINCT time_day AS day FROM arrivals WHERE pulsar = ? AND status = 'live' ORDER BY time_day DESC LIMIT ?`,
    pulsar,
    most,
  );
  return found.map(({ day }) => day).reverse();
}
