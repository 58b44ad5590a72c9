import type { PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import type { EventChange, VerdictRecord } from '../records.ts';
import { type Db, rows, run } from './connection.ts';
import { fromJson, toJson } from './json.ts';

/** The life of an event on record: each revision as it was, and each verdict. Added to, never changed. */

export function historyOf(db: Db, eventId: string): EventChange[] {
  return rows<{ revision: number; at: string; what: string; alert: string | null; body: string }>(
    db,
    'SELECT revision, at, what, alert, body FROM event_changes WHERE event_id = ? ORDER BY revision',
    eventId,
  ).map(({ body, ...change }) => ({ ...change, event: fromJson<PulsarEvent>(body) }));
}

/** The line of one revision: `what` changed, and in words whether that was mailed and why; `alert` null: not on record. */
export interface HistoryLine {
  readonly revision: number;
  readonly what: string;
  readonly alert: string | null;
  readonly at: string;
}

export function addHistory(db: Db, event: PulsarEvent, { revision, what, alert, at }: HistoryLine): void {
  run(
    db,
    'INSERT INTO event_changes (event_id, revision, at, what, alert, body) VALUES (?, ?, ?, ?, ?, ?)',
    event.id,
    revision,
    at,
    what,
    alert,
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
