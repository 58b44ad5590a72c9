import type { EventPicture, EventState, PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import type { EventRecord, ListedEvent } from '../records.ts';
import { type Db, row, rows, run } from './connection.ts';
import { addHistory, historyOf, verdictsOf } from './eventHistory.ts';
import { fromJson, toJson } from './json.ts';
import type { EventFilter, EventUpsert } from './shapes.ts';

/** Events, their pictures, and the ids they had before. */

interface EventRow {
  id: string;
  detector_state: EventState;
  state: EventState;
  revision: number;
  told: number;
  body: string;
  kept_body: string;
  created_at: string;
  changed_at: string;
}

const SELECT = `SELECT e.*, c.body AS kept_body FROM events e
  JOIN event_changes c ON c.event_id = e.id AND c.revision = e.revision`;

export function listEvents(db: Db, filter: EventFilter): ListedEvent[] {
  return rows<EventRow>(
    db,
    `${SELECT}
     WHERE (@since IS NULL OR changed_at >= @since) AND (@pulsar IS NULL OR pulsar = @pulsar
         OR EXISTS (SELECT 1 FROM json_each(e.body, '$.pulsars') WHERE value = @pulsar))
       AND (@state IS NULL OR state = @state) AND (@epochFromMjd IS NULL OR epoch_mjd >= @epochFromMjd)
     ORDER BY epoch_mjd, e.id`,
    {
      since: filter.since ?? null,
      pulsar: filter.pulsar ?? null,
      state: filter.state ?? null,
      epochFromMjd: filter.epochFromMjd ?? null,
    },
  ).map(toListed);
}

/** The id under which an event is on record now. */
export function currentId(db: Db, idOrFormerId: string): string | null {
  const found = row<{ id: string }>(
    db,
    `SELECT id FROM events WHERE id = @id
     UNION ALL SELECT event_id FROM former_ids WHERE former_id = @id LIMIT 1`,
    { id: idOrFormerId },
  );
  return found?.id ?? null;
}

export function eventRecord(db: Db, idOrFormerId: string): EventRecord | null {
  const id = currentId(db, idOrFormerId);
  if (id === null) return null;
  const found = row<EventRow>(db, `${SELECT} WHERE e.id = ?`, id)!;
  const picture = row<{ body: string }>(db, 'SELECT body FROM event_pictures WHERE event_id = ?', id);
  const former = rows<{ former_id: string }>(
    db,
    'SELECT former_id FROM former_ids WHERE event_id = ? ORDER BY at, former_id',
    id,
  );
  return {
    ...toListed(found),
    formerIds: former.map((r) => r.former_id),
    picture: picture === undefined ? null : fromJson<EventPicture>(picture.body),
    history: historyOf(db, id),
    verdicts: verdictsOf(db, id),
  };
}

function toListed(r: EventRow): ListedEvent {
  return {
    event: { ...fromJson<PulsarEvent>(r.body), state: r.state },
    detectorState: r.detector_state,
    lastKept: fromJson<PulsarEvent>(r.kept_body),
    revision: r.revision,
    told: r.told === 1,
    createdAt: r.created_at,
    changedAt: r.changed_at,
  };
}

/** Writes the detector's newest view. `stale`: the revision on record is not the one the caller went by. */
export function upsertEvent(db: Db, upsert: EventUpsert, at: string): 'written' | 'stale' {
  const { event, picture, formerId, revision, change } = upsert;
  if (formerId !== null && formerId !== event.id) renameEvent(db, formerId, event.id, at);
  const before = row<EventRow>(db, `${SELECT} WHERE e.id = ?`, event.id);
  if (before === undefined && change === null)
    throw new Error(`${event.id}: a new event needs a line for its history.`);
  if (revision !== (before?.revision ?? 0) + (change === null ? 0 : 1)) return 'stale';

  const judged = before !== undefined && before.state !== before.detector_state;
  const shown = judged ? before.state : event.state;
  run(
    db,
    `INSERT INTO events (id, pulsar, detector_state, state, epoch_mjd, revision, told, body, created_at, changed_at)
     VALUES (@id, @pulsar, @detectorState, @shown, @epochMjd, @revision, 0, @body, @at, @at)
     ON CONFLICT (id) DO UPDATE SET pulsar = @pulsar, detector_state = @detectorState, state = @shown,
       epoch_mjd = @epochMjd, revision = @revision, body = @body,
       changed_at = CASE WHEN revision = @revision THEN changed_at ELSE @at END`,
    {
      id: event.id,
      pulsar: event.pulsar,
      detectorState: event.state,
      shown,
      epochMjd: event.epochMjd,
      revision,
      body: toJson(`event ${event.id}`, event),
      at,
    },
  );
  putPicture(db, event.id, picture);
  if (change !== null) addHistory(db, event, { revision, what: change, alert: upsert.alert ?? null, at });
  return 'written';
}

function putPicture(db: Db, id: string, picture: EventPicture | null): void {
  run(db, 'DELETE FROM event_pictures WHERE event_id = ?', id);
  if (picture === null) return;
  run(db, 'INSERT INTO event_pictures (event_id, body) VALUES (?, ?)', id, toJson(`picture of ${id}`, picture));
}

/** Late data moved an event: it goes on under a new id, and the old one leads to it for ever. */
function renameEvent(db: Db, from: string, to: string, at: string): void {
  const { changes } = run(db, 'UPDATE events SET id = ? WHERE id = ?', to, from);
  if (changes !== 1) throw new Error(`There is no event ${from} on record that ${to} could continue.`);
  run(db, 'DELETE FROM former_ids WHERE former_id = ?', to);
  run(db, 'INSERT INTO former_ids (former_id, event_id, at) VALUES (?, ?, ?)', from, to, at);
}

/**
 * Forgets an event that nobody was told of, as if it had never been, with the mail about it, none of which was ever attempted.
 * Should it come about again, its first message has the same Message-ID, and must be sent.
 */
export function dropEvent(db: Db, id: string): 'dropped' | 'stale' {
  const found = row<{ told: number }>(db, 'SELECT told FROM events WHERE id = ?', id);
  if (found === undefined) throw new Error(`There is no event ${id} on record to drop.`);
  if (found.told === 1) return 'stale';
  run(db, 'DELETE FROM outbox WHERE message_id IN (SELECT message_id FROM messages WHERE event_id = ?)', id);
  run(db, 'DELETE FROM messages WHERE event_id = ?', id);
  run(db, 'DELETE FROM events WHERE id = ?', id);
  return 'dropped';
}
