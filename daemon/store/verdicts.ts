import type { EventRecord } from '../records.ts';
import { type Db, inTransaction, run } from './connection.ts';
import { step } from './crashStep.ts';
import { addHistory } from './eventHistory.ts';
import { eventRecord } from './events.ts';
import type { VerdictInput, VerdictOutcome } from './shapes.ts';

/** What reviewers decided: added to, never changed. A verdict is shown in place of the detector's state until it is reopened. */

const DONE = { accept: 'accepted', reject: 'rejected', reopen: 'reopened' } as const;

export function recordVerdict(db: Db, idOrFormerId: string, input: VerdictInput): VerdictOutcome {
  const outcome = inTransaction(db, (): VerdictOutcome => {
    const record = eventRecord(db, idOrFormerId);
    if (record === null) return { kind: 'unknown event' };
    if (isRepetition(record, input)) return { kind: 'repeated', record };
    const message = conflict(record, input);
    if (message !== null) return { kind: 'conflict', message, record };
    write(db, record, input);
    return { kind: 'recorded', record: eventRecord(db, record.event.id)! };
  });
  step('verdict on record');
  return outcome;
}

/** A form sent twice, or again because the answer to the first was lost. */
function isRepetition(record: EventRecord, input: VerdictInput): boolean {
  const last = record.verdicts.at(-1);
  return (
    last !== undefined &&
    record.revision === last.revision + 1 &&
    last.verdict === input.verdict &&
    last.by === input.by &&
    last.note === input.note &&
    (input.expectedRevision ?? last.revision) === last.revision
  );
}

function conflict({ event, revision, detectorState, verdicts }: EventRecord, input: VerdictInput): string | null {
  if (input.expectedRevision !== undefined && input.expectedRevision !== revision) {
    return `${event.id} has changed since it was read (revision ${input.expectedRevision}, now ${revision}): look again.`;
  }
  const last = verdicts.at(-1);
  if (input.verdict === 'reopen') {
    return event.state === detectorState ? `${event.id} is ${event.state}: there is no verdict to reopen.` : null;
  }
  return event.state === DONE[input.verdict]
    ? `${event.id} is ${event.state} already, by ${last?.by}, at ${last?.at}.`
    : null;
}

function write(db: Db, record: EventRecord, { verdict, by, note, at }: VerdictInput): void {
  const { id } = record.event;
  const shown = verdict === 'reopen' ? record.detectorState : DONE[verdict];
  run(
    db,
    'INSERT INTO verdicts (event_id, verdict, reviewer, note, at, revision) VALUES (?, ?, ?, ?, ?, ?)',
    id,
    verdict,
    by,
    note,
    at,
    record.revision,
  );
  step('verdict written');
  run(db, 'UPDATE events SET state = ?, revision = revision + 1, told = 1, changed_at = ? WHERE id = ?', shown, at, id);
  const what = `${DONE[verdict]} by ${by}${note === '' ? '' : `: ${note}`}`;
  const line = { revision: record.revision + 1, what, alert: 'not mailed: verdict', at };
  addHistory(db, { ...record.event, state: record.detectorState }, line);
  step('verdict shown');
}
