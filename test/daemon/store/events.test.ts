import { describe, expect, test } from 'vitest';
import { type EventUpsert, emptyBatch, type IntakeBatch, type Store } from '../../../daemon/store/index.ts';
import { AT, LATER, NEXT_DAY, open, sampleEvent, sampleMessage, samplePicture, upsert } from './sample.ts';
import { useRecord } from './useRecord.ts';

const ID = 'KR0417-60003';
let store: Store;
let folder: string;
useRecord((own, path) => {
  store = own;
  folder = path;
});

const commit = (events: readonly EventUpsert[], more: Partial<IntakeBatch> = {}) =>
  store.commitIntake({ ...emptyBatch(more.at ?? AT), ...more, events });
const stateOf = () => store.event(ID)?.event.state;

describe('an event', () => {
  test('has a revision a change, and none for last digits', () => {
    commit([upsert()]);
    commit([upsert({ change: null }, { logBayesFactor: 31.3 })], { at: LATER });
    expect(store.event(ID)).toMatchObject({
      event: { logBayesFactor: 31.3 },
      lastKept: { logBayesFactor: 31.2 },
      revision: 1,
      changedAt: AT,
      picture: samplePicture,
    });
    commit([upsert({ revision: 2, change: 'narrower', picture: null }, { logBayesFactor: 40 })], { at: LATER });
    const record = store.event(ID)!;
    expect(record).toMatchObject({ revision: 2, createdAt: AT, changedAt: LATER, picture: null, told: false });
    expect(record.history.map(({ revision, what, event }) => [revision, what, event.logBayesFactor])).toEqual([
      [1, 'confirmed as glitch', 31.2],
      [2, 'narrower', 40],
    ]);
  });

  test('decided on an old view of the record is stale and leaves nothing', () => {
    commit([upsert()]);
    store.recordVerdict(ID, { verdict: 'accept', by: 'duty', note: '', at: LATER });
    const outcome = commit([upsert({ revision: 2, change: 'narrower' })], { messages: [sampleMessage()] });
    expect(outcome).toEqual({ kind: 'stale', eventId: ID });
    expect(store.outbox()).toEqual([]);
    expect(commit([upsert({ revision: 2 }, { id: 'new' })])).toEqual({ kind: 'stale', eventId: 'new' });
    expect(() => commit([upsert({ change: null }, { id: 'new' })])).toThrow(/history/);
  });

  test('goes on under a new id; every old one leads to it', () => {
    commit([upsert()], { messages: [sampleMessage()] });
    store.recordVerdict(ID, { verdict: 'accept', by: 'duty', note: '', at: LATER });
    commit([upsert({ formerId: ID, revision: 3, change: 'moved' }, { id: 'B' })], { at: LATER });
    commit([upsert({ formerId: 'B', revision: 4, change: 'moved' }, { id: 'C' })], { at: NEXT_DAY });
    for (const id of [ID, 'B', 'C']) {
      expect(store.event(id)).toMatchObject({
        event: { id: 'C', state: 'accepted' },
        formerIds: [ID, 'B'],
        revision: 4,
      });
    }
    expect(store.event('C')?.history).toHaveLength(4);
    expect(store.event('C')?.verdicts).toHaveLength(1);
    expect(store.outbox({ eventId: ID })).toHaveLength(2);
    // And back again: an id is never both.
    commit([upsert({ formerId: 'C', revision: 5, change: 'moved back' }, { id: ID })], { at: NEXT_DAY });
    expect(store.event('C')?.event.id).toBe(ID);
    expect(() => commit([upsert({ formerId: 'unknown' }, { id: 'D' })])).toThrow(/unknown/);
  });

  test('that nobody was told of can be dropped, with the mail that waits; one that was told of cannot', () => {
    commit([upsert()], { messages: [sampleMessage()] });
    expect(commit([], { droppedEvents: [ID] }).kind).toBe('committed');
    expect(store.event(ID)).toBeNull();
    expect(store.outbox()).toEqual([]);

    // It comes about again: its first message must leave, though it has the Message-ID of the one that was dropped.
    commit([upsert()], { messages: [sampleMessage()] });
    expect(store.claimDue(LATER)?.messageId).toBe(sampleMessage().messageId);
    expect(store.event(ID)?.told).toBe(true);
    expect(commit([], { droppedEvents: [ID] })).toEqual({ kind: 'stale', eventId: ID });
    expect(store.event(ID)).not.toBeNull();
  });

  test('lists by time of change, pulsar, state and epoch, oldest first', () => {
    commit([upsert({}, { id: 'b', epochMjd: 60_100, state: 'suspected' }), upsert({}, { id: 'a', epochMjd: 60_200 })]);
    const site = { id: 'c', epochMjd: 60_000, pulsars: ['KR 0417+31', 'KR 2231-08'], pulsar: 'KR 2231-08' };
    commit([upsert({}, site)], { at: LATER });
    const ids = (filter: Parameters<Store['events']>[0]) => store.events(filter).map(({ event }) => event.id);
    expect(ids({})).toEqual(['c', 'b', 'a']);
    expect(ids({ since: LATER })).toEqual(['c']);
    expect(ids({ state: 'suspected' })).toEqual(['b']);
    expect(ids({ pulsar: 'KR 2231-08' })).toEqual(['c']);
    expect(ids({ pulsar: 'KR 0417+31' })).toEqual(['c', 'b', 'a']);
    expect(ids({ epochFromMjd: 60_100 })).toEqual(['b', 'a']);
    expect(store.publishedEvents().map(({ event }) => event)).toEqual(store.events().map(({ event }) => event));
  });
});

describe('a verdict', () => {
  const accept = { verdict: 'accept', by: 'duty', note: 'clear step', at: LATER } as const;
  const reject = { verdict: 'reject', by: 'timing', note: 'receiver change', at: LATER } as const;

  test('is shown until it is reopened, whatever the detector says meanwhile', () => {
    commit([upsert()]);
    const outcome = store.recordVerdict(ID, { ...accept, expectedRevision: 1 });
    expect(outcome).toMatchObject({
      kind: 'recorded',
      record: { revision: 2, told: true, event: { state: 'accepted' } },
    });
    commit([upsert({ revision: 3, change: 'confirmed → withdrawn' }, { state: 'withdrawn' })], { at: NEXT_DAY });
    expect(store.event(ID)).toMatchObject({
      event: { state: 'accepted' },
      detectorState: 'withdrawn',
      lastKept: { state: 'withdrawn' },
    });
    store.recordVerdict(ID, { verdict: 'reopen', by: 'duty', note: '', at: NEXT_DAY });
    expect(stateOf()).toBe('withdrawn');
    expect(store.event(ID)?.history.map(({ what }) => what)).toEqual([
      'confirmed as glitch',
      'accepted by duty: clear step',
      'confirmed → withdrawn',
      'reopened by duty',
    ]);
    expect(store.event(ID)?.verdicts).toEqual([
      { ...accept, revision: 1 },
      { verdict: 'reopen', by: 'duty', note: '', at: NEXT_DAY, revision: 3 },
    ]);
  });

  test('on an old view is a conflict that shows the new one', () => {
    commit([upsert()]);
    store.recordVerdict(ID, { ...accept, expectedRevision: 1 });
    const second = store.recordVerdict(ID, { ...reject, expectedRevision: 1 });
    expect(second).toMatchObject({ kind: 'conflict', record: { event: { state: 'accepted' }, revision: 2 } });
    expect(second.kind === 'conflict' && second.message).toMatch(/revision 1, now 2/);
    expect(store.event(ID)?.verdicts).toHaveLength(1);
    expect(store.recordVerdict(ID, { ...reject, expectedRevision: 2 }).kind).toBe('recorded');
    expect(stateOf()).toBe('rejected');
  });

  test('sent twice is one verdict', () => {
    commit([upsert()]);
    store.recordVerdict(ID, { ...accept, expectedRevision: 1 });
    expect(store.recordVerdict(ID, { ...accept, expectedRevision: 1, at: NEXT_DAY }).kind).toBe('repeated');
    expect(store.recordVerdict(ID, accept).kind).toBe('repeated');
    expect(store.event(ID)).toMatchObject({ revision: 2, verdicts: [{ ...accept, revision: 1 }] });
  });

  test('that changes nothing is a conflict, and an unknown event is said to be unknown', () => {
    commit([upsert()]);
    expect(store.recordVerdict(ID, { ...accept, verdict: 'reopen' }).kind).toBe('conflict');
    store.recordVerdict(ID, accept);
    expect(store.recordVerdict(ID, { ...accept, by: 'timing' })).toMatchObject({ kind: 'conflict' });
    expect(store.recordVerdict('none', accept)).toEqual({ kind: 'unknown event' });
  });

  test('from a second connection beside the daemon is seen by it at once', () => {
    commit([upsert()]);
    const reader = open(folder, 'reader');
    expect(reader.recordVerdict(ID, reject).kind).toBe('recorded');
    reader.close();
    expect(stateOf()).toBe('rejected');
    expect(commit([upsert({ revision: 2, change: 'x' })])).toEqual({ kind: 'stale', eventId: ID });
  });

  test('the detector cannot set a reviewer\u2019s state', () => {
    expect(() => commit([{ ...upsert(), event: sampleEvent({ state: 'accepted' }) }])).toThrow(/CHECK/);
  });
});
