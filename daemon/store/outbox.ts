import type { MailAttempt, OutboxRecord } from '../records.ts';
import { type Db, inTransaction, row, rows, run } from './connection.ts';
import { step } from './crashStep.ts';
import { currentId } from './events.ts';
import * as meta from './meta.ts';
import type { ClaimedMail, MailOutcome, NewMessage, OutboxCounts, OutboxFilter } from './shapes.ts';

/**
 * Mail that must leave: one row a message and recipient, written in the transaction that caused it. States go one way,
 * queued → attempting → delivered | refused | expired; back to queued only after an attempt that may be repeated.
 */

interface OutboxRow extends Omit<OutboxRecord, 'possibleDuplicate'> {
  readonly possibleDuplicate: number;
}

const SELECT = `SELECT o.id, o.message_id AS messageId, o.recipient, m.subject, m.kind, m.event_id AS eventId, o.state,
  o.attempts, o.due_at AS dueAt, o.last_error AS lastError, o.possible_duplicate AS possibleDuplicate,
  m.created_at AS createdAt, m.may_leave_at AS mayLeaveAt, o.delivered_at AS deliveredAt
  FROM outbox o JOIN messages m ON m.message_id = o.message_id`;

/**
 * Queues for each recipient that does not have this message yet; a Message-ID on record is the same message. What a restore
 * found delivered is not sent again, but other news under its Message-ID is, marked: rather twice than never.
 */
export function enqueue(db: Db, message: NewMessage, at: string): void {
  run(
    db,
    `INSERT INTO messages (message_id, kind, event_id, subject, in_reply_to, content, created_at, may_leave_at)
     VALUES (?, ?, ?, ?, ?, ?, ?, ?) ON CONFLICT (message_id) DO NOTHING`,
    message.messageId,
    message.kind,
    message.eventId,
    message.subject,
    message.inReplyTo,
    message.content,
    at,
    message.dueAt,
  );
  for (const recipient of message.recipients) {
    const before = deliveredBefore(db, message.messageId, recipient);
    const leftAlready = before?.subject === message.subject;
    run(
      db,
      `INSERT INTO outbox (message_id, recipient, state, attempts, due_at, last_error, possible_duplicate, unknown_ends,
         delivered_at) VALUES (?, ?, ?, 0, ?, NULL, ?, 0, ?) ON CONFLICT (message_id, recipient) DO NOTHING`,
      message.messageId,
      recipient,
      leftAlready ? 'delivered' : 'queued',
      message.dueAt,
      before !== undefined && !leftAlready ? 1 : 0,
      leftAlready ? before.delivered_at : null,
    );
    if (before !== undefined && message.eventId !== null) markTold(db, message.eventId);
    step('outbox row written');
  }
}

function deliveredBefore(
  db: Db,
  messageId: string,
  recipient: string,
): { readonly subject: string; readonly delivered_at: string } | undefined {
  return row(
    db,
    'SELECT subject, delivered_at FROM delivered_before WHERE message_id = ? AND recipient = ?',
    messageId,
    recipient,
  );
}

function markTold(db: Db, eventId: string): void {
  run(db, 'UPDATE events SET told = 1 WHERE id = ?', eventId);
}

const REPLACED = 'a newer message replaced it before it left';

/** What is replaced was not given up: its news leaves with the newer message. */
export function supersede(db: Db, messageId: string): void {
  run(
    db,
    "UPDATE outbox SET state = 'expired', last_error = ? WHERE message_id = ? AND state = 'queued'",
    REPLACED,
    messageId,
  );
}

export function commitDigest(db: Db, civilDate: string, message: NewMessage, at: string): boolean {
  return inTransaction(db, () => {
    if (row(db, 'SELECT 1 FROM digests WHERE civil_date = ?', civilDate) !== undefined) return false;
    enqueue(db, message, at);
    run(db, 'INSERT INTO digests (civil_date, message_id, at) VALUES (?, ?, ?)', civilDate, message.messageId, at);
    step('digest written');
    return true;
  });
}

export function lastDigest(db: Db): { readonly civilDate: string; readonly at: string } | null {
  return (
    row<{ civilDate: string; at: string }>(
      db,
      'SELECT civil_date AS civilDate, at FROM digests ORDER BY civil_date DESC LIMIT 1',
    ) ?? null
  );
}

export function commitNotice(
  db: Db,
  message: NewMessage,
  at: string,
  remember: Readonly<Record<string, string>>,
): void {
  inTransaction(db, () => {
    enqueue(db, message, at);
    for (const [key, value] of Object.entries(remember)) meta.write(db, key, value);
  });
}

/** First tries go before repeated ones; about one event, a recipient gets the messages in the order they were queued. */
export function claimDue(db: Db, now: string): ClaimedMail | null {
  return inTransaction(db, () => {
    const due = row<OutboxRow & { inReplyTo: string | null; content: string }>(
      db,
      `${SELECT.replace('SELECT', 'SELECT m.in_reply_to AS inReplyTo, m.content,')}
       WHERE o.state = 'queued' AND o.due_at <= ? AND NOT EXISTS (
         SELECT 1 FROM outbox e JOIN messages em ON em.message_id = e.message_id
         WHERE e.recipient = o.recipient AND e.state IN ('queued', 'attempting') AND e.id < o.id AND em.event_id = m.event_id)
       ORDER BY o.attempts > 0, o.due_at, o.id LIMIT 1`,
      now,
    );
    if (due === undefined) return null;
    run(
      db,
      "UPDATE outbox SET state = 'attempting', attempts = attempts + 1 WHERE id = ? AND state = 'queued'",
      due.id,
    );
    run(
      db,
      'INSERT INTO mail_attempts (outbox_id, number, begun_at, outcome) VALUES (?, ?, ?, NULL)',
      due.id,
      due.attempts + 1,
      now,
    );
    step('mail claimed');
    if (due.eventId !== null) markTold(db, due.eventId);
    step('event told');
    return {
      ...due,
      state: 'attempting',
      attempts: due.attempts + 1,
      possibleDuplicate: due.possibleDuplicate === 1,
    };
  });
}

export function settle(db: Db, id: number, outcome: MailOutcome): void {
  inTransaction(db, () => {
    const found = row<{ state: string; unknown_ends: number }>(
      db,
      'SELECT state, unknown_ends FROM outbox WHERE id = ?',
      id,
    );
    if (found?.state !== 'attempting') {
      throw new Error(`Outbox row ${id} is ${found?.state ?? 'not on record'}: only an attempt can be settled.`);
    }
    if (outcome.kind === 'delivered') {
      run(
        db,
        "UPDATE outbox SET state = 'delivered', delivered_at = ?, last_error = ? WHERE id = ?",
        outcome.at,
        outcome.remark ?? null,
        id,
      );
    } else if (outcome.kind === 'later') {
      requeue(db, id, outcome.dueAt, outcome.error);
    } else if (outcome.kind === 'unknown') {
      run(db, 'UPDATE outbox SET possible_duplicate = 1, unknown_ends = unknown_ends + 1 WHERE id = ?', id);
      if (found.unknown_ends === 0) requeue(db, id, outcome.dueAt, outcome.error);
      else
        end(db, id, {
          ...outcome,
          kind: 'expired',
          error: `may have arrived, twice without an answer: ${outcome.error}`,
        });
    } else {
      end(db, id, outcome);
    }
    endAttempt(db, id, outcome);
    step('mail settled');
  });
}

function endAttempt(db: Db, id: number, outcome: MailOutcome): void {
  const words = {
    delivered: 'delivered',
    later: 'put off',
    unknown: 'no answer, may have arrived',
    refused: 'refused',
    expired: 'given up',
  }[outcome.kind];
  const why = outcome.kind === 'delivered' ? outcome.remark : outcome.error;
  const text = why === undefined ? words : `${words}: ${why}`;
  run(db, 'UPDATE mail_attempts SET outcome = ? WHERE outbox_id = ? AND outcome IS NULL', text, id);
}

/** Of each of these rows, oldest first; of attempts from before this was kept, none. */
export function attemptsAt(db: Db, ids: readonly number[]): Map<number, MailAttempt[]> {
  const found = rows<MailAttempt & { id: number }>(
    db,
    `SELECT outbox_id AS id, begun_at AS begunAt, outcome FROM mail_attempts
     WHERE outbox_id IN (SELECT value FROM json_each(?)) ORDER BY outbox_id, number`,
    JSON.stringify(ids),
  );
  const attempts = new Map<number, MailAttempt[]>();
  for (const { id, ...attempt } of found) attempts.set(id, [...(attempts.get(id) ?? []), attempt]);
  return attempts;
}

function requeue(db: Db, id: number, dueAt: string, error: string): void {
  run(db, "UPDATE outbox SET state = 'queued', due_at = ?, last_error = ? WHERE id = ?", dueAt, error, id);
}

interface End {
  readonly kind: 'refused' | 'expired';
  readonly error: string;
  readonly at: string;
}

function end(db: Db, id: number, { kind, error, at }: End): void {
  run(db, 'UPDATE outbox SET state = ?, last_error = ?, given_up_at = ? WHERE id = ?', kind, error, at, id);
}

/** At start nobody is attempting: such a row was cut off, and its message may have arrived. It goes again, marked. */
export function requeueCutOff(db: Db): void {
  run(
    db,
    `UPDATE mail_attempts SET outcome = 'cut off: the program stopped, may have arrived'
     WHERE outcome IS NULL AND outbox_id IN (SELECT id FROM outbox WHERE state = 'attempting')`,
  );
  run(
    db,
    `UPDATE outbox SET state = 'queued', possible_duplicate = 1, last_error = 'the program stopped during the attempt'
     WHERE state = 'attempting'`,
  );
}

export function expireOlderThan(db: Db, createdBefore: string, { error, at }: Omit<End, 'kind'>): OutboxRecord[] {
  return inTransaction(db, () => {
    const old = rows<OutboxRow>(
      db,
      `${SELECT} WHERE o.state = 'queued' AND m.created_at < ? ORDER BY o.id`,
      createdBefore,
    );
    for (const { id } of old) end(db, id, { kind: 'expired', error, at });
    return old.map((r) => ({ ...toRecord(r), state: 'expired', lastError: error }));
  });
}

export function listOutbox(db: Db, filter: OutboxFilter): OutboxRecord[] {
  return rows<OutboxRow>(
    db,
    `${SELECT} WHERE (@state IS NULL OR o.state = @state) AND (@kind IS NULL OR m.kind = @kind)
       AND (@eventId IS NULL OR m.event_id = @eventId) AND (@since IS NULL OR m.created_at >= @since)
       AND (@givenUpSince IS NULL OR o.given_up_at >= @givenUpSince)
       AND (@mayLeaveSince IS NULL OR m.may_leave_at >= @mayLeaveSince) ORDER BY o.id`,
    {
      state: filter.state ?? null,
      kind: filter.kind ?? null,
      eventId: filter.eventId === undefined ? null : (currentId(db, filter.eventId) ?? filter.eventId),
      since: filter.since ?? null,
      givenUpSince: filter.givenUpSince ?? null,
      mayLeaveSince: filter.mayLeaveSince ?? null,
    },
  ).map(toRecord);
}

export function outboxCounts(db: Db): OutboxCounts {
  const counts = { queued: 0, attempting: 0, delivered: 0, refused: 0, expired: 0 };
  for (const { state, n } of rows<{ state: OutboxRecord['state']; n: number }>(
    db,
    'SELECT state, count(*) AS n FROM outbox GROUP BY state',
  )) {
    counts[state] = n;
  }
  const oldest = row<{ at: string | null }>(
    db,
    `SELECT min(max(m.created_at, m.may_leave_at)) AS at FROM outbox o JOIN messages m ON m.message_id = o.message_id
     WHERE o.state IN ('queued', 'attempting')`,
  );
  return { ...counts, oldestWaitingSince: oldest?.at ?? null };
}

function toRecord(r: OutboxRow): OutboxRecord {
  return { ...r, possibleDuplicate: r.possibleDuplicate === 1 };
}
