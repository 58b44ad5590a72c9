import type { ToldBefore } from '../../alerts/index.ts';
import type { EventChange, OutboxRecord } from '../records.ts';
import type { Station } from '../station.ts';

/** What people outside know of an event: from the outbox, against its history. */

export interface Mailed {
  readonly told: ToldBefore | null;
  readonly toldRevision: number | null;
  /** Messages of which no attempt was made yet, to anybody. */
  readonly unsent: readonly string[];
}

export const NOTHING_MAILED: Mailed = { told: null, toldRevision: null, unsent: [] };

/** What may have left about an event. Mail that only waits tells nobody: news replaces it. */
export function mailedSoFar({ store }: Pick<Station, 'store'>, eventId: string): Mailed {
  const copies = store.outbox({ eventId, kind: 'event' });
  const left = new Set(copies.filter(mayHaveLeft).map((copy) => copy.messageId));
  const unsent = new Set(
    copies.filter((copy) => copy.state === 'queued' && !left.has(copy.messageId)).map((copy) => copy.messageId),
  );
  const sent = copies.filter((copy) => left.has(copy.messageId));
  const first = sent[0];
  const last = sent.at(-1);
  const described = last === undefined ? null : asDescribed(store.event(eventId)?.history ?? [], last);
  if (first === undefined || described === null) return { ...NOTHING_MAILED, unsent: [...unsent] };
  return {
    told: { firstMessageId: first.messageId, as: described.event, recipients: heardBy(sent) },
    toldRevision: described.revision,
    unsent: [...unsent],
  };
}

/** Whoever has a copy or will get it; a copy that was given up without an answer may have arrived too. */
function heardBy(sent: readonly OutboxRecord[]): string[] {
  const gone = (copy: OutboxRecord) =>
    copy.state === 'refused' || (copy.state === 'expired' && !copy.possibleDuplicate);
  return [...new Set(sent.filter((copy) => !gone(copy)).map((copy) => copy.recipient))];
}

function mayHaveLeft(copy: OutboxRecord): boolean {
  return copy.attempts > 0 || copy.state === 'delivered';
}

/** A revision and the mail about it are written in one transaction, with one time. */
function asDescribed(history: readonly EventChange[], mail: OutboxRecord): EventChange | null {
  const exact = history.find((change) => change.at === mail.createdAt);
  return exact ?? history.findLast((change) => change.at <= mail.createdAt) ?? history[0] ?? null;
}

/** The revision that a notice of this one supersedes or retracts: the last before it that was mailed; null: none was. */
export function citedRevision({ store }: Pick<Station, 'store'>, eventId: string, revision: number): number | null {
  const history = store.event(eventId)?.history ?? [];
  const told = store
    .outbox({ eventId, kind: 'event' })
    .filter(mayHaveLeft)
    .map((copy) => asDescribed(history, copy)?.revision ?? 0)
    .filter((earlier) => earlier > 0 && earlier < revision);
  return told.length === 0 ? null : Math.max(...told);
}
