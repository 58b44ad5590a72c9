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
  return rows<{ body: string; state: EventState; what: string; at: string }>(
    db,
    `SELECT e.body, e.state, c.what, c.at FROM event_changes c JOIN events e ON e.id = c.event_id
     WHERE c.at >= ? AND c.revision > 1 ORDER BY c.at DESC, e.id, c.revision DESC`,
    since,
  ).map(({ body, state, what, at }) => ({ event: { ...fromJson<PulsarEvent>(body), state }, what, at }));
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
