import { expect, test } from 'vitest';
import { emptyBatch, type Store } from '../../../daemon/store/index.ts';
import { AT, fileBatch, LATER, NEXT_DAY, sampleArrival, sampleFile, upsert } from './sample.ts';
import { useRecord } from './useRecord.ts';

let store: Store;
useRecord((own) => {
  store = own;
});

test('what came in and what was quarantined since a time', () => {
  store.commitIntake(fileBatch(0, 3));
  store.commitIntake({
    ...emptyBatch(NEXT_DAY),
    file: sampleFile(3, { path: 'night-2.csv', feed: 'south' }),
    arrivals: [sampleArrival(3), { ...sampleArrival(4), revises: 'key-000000' }],
    statusChanges: [{ key: 'key-000000', status: 'revised', reason: 'another value' }],
    quarantined: [{ line: 5, reason: 'site: unknown' }],
  });
  store.commitIntake({
    ...emptyBatch(NEXT_DAY),
    file: sampleFile(0, { path: 'junk.csv', fault: 'not UTF-8' }),
    quarantined: [{ line: null, reason: 'not UTF-8' }],
  });
  expect(store.intakeSince(LATER)).toEqual({ files: 1, arrivals: 2, pulsars: 1 });
  expect(store.intakeSince(AT)).toEqual({ files: 2, arrivals: 5, pulsars: 1 });
  expect(store.intakeSince('2027-01-01T00:00:00Z')).toEqual({ files: 0, arrivals: 0, pulsars: 0 });
  expect(store.quarantinedSince(LATER)).toEqual([
    { feed: 'south', file: 'night-2.csv', line: 5, reason: 'site: unknown', at: NEXT_DAY },
    { feed: 'nightly', file: 'junk.csv', line: null, reason: 'not UTF-8', at: NEXT_DAY },
  ]);
  expect(store.lastFileByFeed()).toEqual(
    new Map([
      ['nightly', NEXT_DAY],
      ['south', NEXT_DAY],
    ]),
  );
});

test('the latest files and their quarantined rows, without what was delivered again since', () => {
  store.commitIntake({
    ...fileBatch(0, 1, { rows: 2 }),
    quarantined: [{ line: 9, pulsar: 'KR 1', reason: 'site: unknown' }],
  });
  store.commitIntake({ ...fileBatch(1, 1, { rows: 2, path: 'b.csv' }), quarantined: [{ line: 4, reason: 'no time' }] });
  expect(store.recentQuarantine(10).map(({ file, line }) => [file, line])).toEqual([
    ['b.csv', 4],
    ['night-1.csv', 9],
  ]);
  expect(store.quarantineOf('KR 1').map(({ file, line }) => [file, line])).toEqual([['night-1.csv', 9]]);
  store.commitIntake({ ...emptyBatch(LATER), file: sampleFile(1), sightings: [{ key: 'key-000000', line: 2 }] });
  expect(store.recentQuarantine(10).map(({ file }) => file)).toEqual(['b.csv']);
  expect(store.quarantineOf('KR 1')).toEqual([]);
  expect(store.recentFiles(2).map(({ path, same, takenInAt }) => [path, same, takenInAt])).toEqual([
    ['night-1.csv', 1, LATER],
    ['b.csv', 0, AT],
  ]);
});

test('the last live arrival of each pulsar', () => {
  store.commitIntake({
    ...fileBatch(0, 0, { rows: 3 }),
    arrivals: [sampleArrival(0), sampleArrival(1), sampleArrival(2, { pulsar: 'KR 2231-08' })],
  });
  store.commitIntake({
    ...emptyBatch(LATER),
    statusChanges: [{ key: 'key-000001', status: 'withdrawn', reason: 'gone' }],
  });
  const last = store.lastArrivalByPulsar();
  expect([...last.keys()]).toEqual(['KR 0417+31', 'KR 2231-08']);
  expect(last.get('KR 0417+31')).toBeCloseTo(60_000.1278901, 6);
});

test('changes of events, newest first', () => {
  store.commitIntake({ ...emptyBatch(AT), events: [upsert()] });
  store.commitIntake({ ...emptyBatch(LATER), events: [upsert({ revision: 2, change: 'narrower' })] });
  store.recordVerdict('KR0417-60003', { verdict: 'reject', by: 'duty', note: 'session', at: NEXT_DAY });
  expect(store.eventChangesSince(AT).map(({ what, at, event }) => [what, at, event.state])).toEqual([
    ['rejected by duty: session', NEXT_DAY, 'rejected'],
    ['narrower', LATER, 'rejected'],
    [upsert().change, AT, 'rejected'],
  ]);
  expect(store.eventChangesSince(AT).map(({ isFirst }) => isFirst)).toEqual([false, false, true]);
  expect(store.eventChangesSince(NEXT_DAY)).toHaveLength(1);
});

test('small facts are kept and replaced', () => {
  expect(store.meta('program version')).toBeNull();
  store.setMeta('program version', '0.1.0');
  store.setMeta('program version', '0.2.0');
  expect(store.meta('program version')).toBe('0.2.0');
});
