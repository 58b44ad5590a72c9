import type { PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import type { EventChange, VerdictRecord } from '../records.ts';
import { type Db, rows, run } from './connection.ts';
import { fromJson, toJson } from './json.ts';

/** The life of an event on record: each revision as it was, and each verdict. Added to, never changed. */

export function historyOf(db: Db, eventId: string): EventChange[] {
  return rows<{ revision: number; at: string; what: string; body: string }>(
    db,
    'SELECT revision, at, what, body FROM event_changes WHERE event_id = ? ORDER BY revision',
    eventId,
  ).map(({ body, ...change }) => ({ ...change, event: fromJson<PulsarEvent>(body) }));
}

export function addHistory(db: Db, event: PulsarEvent, revision: number, what: string, at: string): void {
  run(
    db,
    'INSERT INTO event_changes (event_id, revision, at, what, body) VALUES (?, ?, ?, ?, ?)',
    event.id,
    revision,
    at,
    what,
    toJson(`event ${event.id}`, event),
  );
}

export function verdictsOf(db: Db, eventId: string): VerdictRecord[] {
  return rows<VerdictRecord>(
    db,
    'SELECT verdict, reviewer AS "by", note, at, revision FROM verdicts WHERE event_id = ? ORDER BY id',
    eventId,
  );
}
