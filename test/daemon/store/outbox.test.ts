import { describe, expect, test } from 'vitest';
import { emptyBatch, type Store } from '../../../daemon/store/index.ts';
import { AT, LATER, NEXT_DAY, notice, open, sampleMessage, upsert } from './sample.ts';
import { useRecord } from './useRecord.ts';

let store: Store;
let folder: string;
const record = useRecord((own, path) => {
  store = own;
  folder = path;
});

describe('a message', () => {
  test('is claimed once, with all that sending needs', () => {
    store.commitNotice(notice(1, { inReplyTo: '<0@x>' }), AT, { 'silence nightly': AT });
    expect(store.meta('silence nightly')).toBe(AT);
    expect(store.claimDue('2026-03-01T05:59:59.999Z')).toBeNull();
    expect(store.claimDue(AT)).toMatchObject({
      messageId: '<notice-1@kestrel-ridge.example>',
      recipient: 'duty@kestrel-ridge.example',
      state: 'attempting',
      attempts: 1,
      inReplyTo: '<0@x>',
      content: notice(1).content,
      possibleDuplicate: false,
    });
    expect(store.claimDue(LATER)).toBeNull();
  });

  test('queued again is the same message: only new recipients are added', () => {
    store.commitNotice(notice(1), AT);
    store.commitNotice(notice(1, { recipients: ['duty@kestrel-ridge.example', 'new@kestrel-ridge.example'] }), LATER);
    expect(store.outbox().map(({ recipient }) => recipient)).toEqual([
      'duty@kestrel-ridge.example',
      'new@kestrel-ridge.example',
    ]);
  });

  test('D7: of several recipients: each has an end of its own', () => {
    store.commitIntake({
      ...emptyBatch(AT),
      events: [upsert()],
      messages: [sampleMessage({ recipients: ['a@x', 'b@x', 'c@x'] })],
    });
    const [a, b, c] = [store.claimDue(AT)!, store.claimDue(AT)!, store.claimDue(AT)!];
    store.settle(a.id, { kind: 'delivered', at: LATER });
    store.settle(b.id, { kind: 'refused', error: '550 no such user', at: LATER });
    store.settle(c.id, { kind: 'later', dueAt: LATER, error: '451 greylisted' });
    expect(
      store
        .outbox({ eventId: 'KR0417-60003' })
        .map(({ state, lastError, deliveredAt }) => [state, lastError, deliveredAt]),
    ).toEqual([
      ['delivered', null, LATER],
      ['refused', '550 no such user', null],
      ['queued', '451 greylisted', null],
    ]);
    expect(store.outboxCounts()).toEqual({
      queued: 1,
      attempting: 0,
      delivered: 1,
      refused: 1,
      expired: 0,
      oldestWaitingSince: AT,
    });
    expect(store.outbox({ state: 'refused' })).toHaveLength(1);
    expect(store.outbox({ kind: 'digest' })).toEqual([]);
  });

  test('about one event goes in order to each recipient, and does not hold up others', () => {
    const second = sampleMessage({ messageId: '<2@x>', inReplyTo: sampleMessage().messageId });
    store.commitIntake({ ...emptyBatch(AT), events: [upsert()], messages: [sampleMessage(), second] });
    store.commitNotice(notice(1), AT);
    const first = store.claimDue(AT)!;
    store.settle(first.id, { kind: 'later', dueAt: NEXT_DAY, error: '421' });
    const left: string[] = [];
    for (let mail = store.claimDue(LATER); mail !== null; mail = store.claimDue(LATER)) {
      left.push(`${mail.messageId} ${mail.recipient}`);
      store.settle(mail.id, { kind: 'delivered', at: LATER });
    }
    expect(left).toEqual([
      `${sampleMessage().messageId} timing@kestrel-ridge.example`,
      '<2@x> timing@kestrel-ridge.example',
      '<notice-1@kestrel-ridge.example> duty@kestrel-ridge.example',
    ]);
    expect(store.claimDue(NEXT_DAY)?.messageId).toBe(sampleMessage().messageId);
  });

  test('a first try goes before a repeated one', () => {
    store.commitNotice(notice(1), AT);
    store.settle(store.claimDue(AT)!.id, { kind: 'later', dueAt: AT, error: '451' });
    store.commitNotice(notice(2, { dueAt: LATER }), LATER);
    expect(store.claimDue(LATER)?.messageId).toContain('notice-2');
    expect(store.claimDue(LATER)?.messageId).toContain('notice-1');
  });
});

describe('an end', () => {
  test('that is unknown is tried once more, marked, and then given up', () => {
    store.commitNotice(notice(1), AT);
    store.settle(store.claimDue(AT)!.id, {
      kind: 'unknown',
      dueAt: LATER,
      error: 'lost after the final dot',
      at: LATER,
    });
    const again = store.claimDue(LATER)!;
    expect(again).toMatchObject({ possibleDuplicate: true, attempts: 2 });
    store.settle(again.id, { kind: 'unknown', dueAt: NEXT_DAY, error: 'lost again', at: LATER });
    expect(store.outbox()).toMatchObject([{ state: 'expired', lastError: expect.stringContaining('lost again') }]);
    expect(store.claimDue(NEXT_DAY)).toBeNull();
  });

  test('that is held leaves when it may, and does not count as waiting before', () => {
    store.commitNotice({ ...notice(1), dueAt: NEXT_DAY }, AT);
    expect(store.claimDue(LATER)).toBeNull();
    expect(store.outboxCounts()).toMatchObject({ queued: 1, oldestWaitingSince: NEXT_DAY });
    expect(store.outbox({ mayLeaveSince: LATER })).toMatchObject([{ createdAt: AT, mayLeaveAt: NEXT_DAY }]);
    store.settle(store.claimDue(NEXT_DAY)!.id, { kind: 'later', dueAt: '2100-01-01T00:00:00.000Z', error: '451' });
    expect(store.outboxCounts().oldestWaitingSince).toBe(NEXT_DAY);
  });

  test('is final, and only an attempt can be settled', () => {
    store.commitNotice(notice(1), AT);
    expect(() => store.settle(1, { kind: 'delivered', at: AT })).toThrow(/queued/);
    store.claimDue(AT);
    store.settle(1, { kind: 'expired', error: 'too old', at: AT });
    expect(() => store.settle(1, { kind: 'delivered', at: AT })).toThrow(/expired/);
    expect(() => store.settle(99, { kind: 'delivered', at: AT })).toThrow(/not on record/);
  });

  test('D8: cut off by a crash: queued again, marked', () => {
    store.commitNotice(notice(1), AT);
    store.claimDue(AT);
    record.reopen();
    expect(store.outbox()).toMatchObject([{ state: 'queued', possibleDuplicate: true, attempts: 1 }]);
    expect(store.claimDue(AT)).toMatchObject({ attempts: 2, possibleDuplicate: true });
  });

  test('a reader beside a running attempt does not take it for cut off', () => {
    store.commitNotice(notice(1), AT);
    store.claimDue(AT);
    open(folder, 'reader').close();
    expect(store.outbox()).toMatchObject([{ state: 'attempting', possibleDuplicate: false }]);
  });

  test('old mail expires, what is being attempted does not, and newer mail replaces what waits', () => {
    store.commitNotice(notice(1), AT);
    store.commitNotice(notice(2), AT);
    store.commitNotice(notice(3), LATER);
    store.claimDue(AT);
    expect(store.expireOlderThan(LATER, { error: 'not delivered in five days', at: NEXT_DAY })).toMatchObject([
      { id: 2, state: 'expired', lastError: 'not delivered in five days' },
    ]);
    store.commitIntake({ ...emptyBatch(LATER), supersededMessages: [notice(1).messageId, notice(3).messageId] });
    expect(store.outbox().map(({ state }) => state)).toEqual(['attempting', 'expired', 'expired']);
    // What was replaced was not given up.
    expect(store.outbox({ givenUpSince: AT }).map(({ id }) => id)).toEqual([2]);
    expect(store.outbox({ givenUpSince: '2100-01-01T00:00:00.000Z' })).toEqual([]);
  });
});

test('one digest a civil date, whoever asks and however often', () => {
  expect(store.lastDigest()).toBeNull();
  expect(store.commitDigest('2026-03-29', notice(1, { kind: 'digest' }), AT)).toBe(true);
  expect(store.commitDigest('2026-03-29', notice(2, { kind: 'digest' }), LATER)).toBe(false);
  expect(store.outbox({ kind: 'digest' })).toHaveLength(1);
  record.reopen();
  expect(store.commitDigest('2026-03-29', notice(3, { kind: 'digest' }), LATER)).toBe(false);
  expect(store.commitDigest('2026-03-30', notice(4, { kind: 'digest' }), NEXT_DAY)).toBe(true);
  expect(store.lastDigest()).toEqual({ civilDate: '2026-03-30', at: NEXT_DAY });
});
