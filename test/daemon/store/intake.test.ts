import { describe, expect, test } from 'vitest';
import { emptyBatch, type Store } from '../../../daemon/store/index.ts';
import { AT, fileBatch, LATER, sampleArrival, sampleFile, sampleMessage, upsert } from './sample.ts';
import { useRecord } from './useRecord.ts';

let store: Store;
useRecord((own) => {
  store = own;
});

const keys = (arrivals: readonly { readonly key: string }[]) => arrivals.map(({ key }) => key);

describe('a file', () => {
  test('comes back as it was given, to the last digit', () => {
    const given = sampleArrival(7, {
      timeText: '60007.00000000000000012345',
      time: { day: 60_007, fraction: 1.2345e-16 },
      frequencyMhz: Number.POSITIVE_INFINITY,
      pulseNumber: 12_345_678_901_234,
      signalToNoise: 0,
      note: 'cloud; Δν\u0000"',
      site: 'barycentre',
    });
    const outcome = store.commitIntake({ ...fileBatch(0, 0, { rows: 1 }), arrivals: [given] });
    expect(outcome).toEqual({ kind: 'committed', fileId: 1 });
    const { received, barycentred, revises: _, ...rest } = given;
    expect(store.arrival(given.key)).toEqual({
      ...rest,
      ...received,
      tdb: barycentred?.tdb,
      delays: barycentred?.delays,
      fileId: 1,
      status: 'live',
      reason: '',
      takenInAt: AT,
    });
    expect(store.arrival('no such key')).toBeNull();
  });

  test('is known by feed and path, its newest revision with its stat signature', () => {
    store.commitIntake(fileBatch(0, 2));
    store.commitIntake({
      ...emptyBatch(LATER),
      file: sampleFile(3, { signature: '1200:2' }),
      arrivals: [{ ...sampleArrival(5), revises: 'key-000000' }],
      sightings: [{ key: 'key-000001', line: 3 }],
      statusChanges: [{ key: 'key-000000', status: 'revised', reason: 'another value in revision 2' }],
      quarantined: [{ line: 4, reason: 'site: unknown' }],
    });
    expect(store.knownFile('nightly', 'night-1.csv')).toEqual({
      ...sampleFile(3),
      id: 2,
      revision: 2,
      signature: '1200:2',
      takenInAt: LATER,
      stored: 0,
      same: 1,
      revised: 1,
      quarantined: 1,
    });
    expect(store.knownFile('other', 'night-1.csv')).toBeNull();
    expect(keys(store.arrivalsOfFile('nightly', 'night-1.csv'))).toEqual(['key-000001', 'key-000005']);
    expect(store.arrival('key-000000')).toMatchObject({ status: 'revised', reason: 'another value in revision 2' });
    expect(keys(store.liveArrivals('KR 0417+31'))).toEqual(['key-000001', 'key-000005']);
    expect(keys(store.arrivals('KR 0417+31'))).toEqual(['key-000000', 'key-000001', 'key-000005']);

    store.noteUnchanged(2, '1200:3');
    expect(store.knownFile('nightly', 'night-1.csv')?.signature).toBe('1200:3');
    expect(() => store.noteUnchanged(99, 'x')).toThrow(/99/);
  });

  test('that cannot be read leaves its earlier revision standing', () => {
    store.commitIntake(fileBatch(0, 2));
    store.commitIntake({
      ...emptyBatch(LATER),
      file: sampleFile(0, { fault: 'not UTF-8' }),
      quarantined: [{ line: null, reason: 'not UTF-8' }],
    });
    expect(store.knownFile('nightly', 'night-1.csv')).toMatchObject({ revision: 2, fault: 'not UTF-8', rows: 0 });
    expect(keys(store.arrivalsOfFile('nightly', 'night-1.csv'))).toEqual(['key-000000', 'key-000001']);
  });

  test('whose rows are not all accounted for is refused', () => {
    expect(() => store.commitIntake(fileBatch(0, 2, { rows: 3 }))).toThrow(/3 rows were read but 2/);
    expect(() => store.commitIntake({ ...fileBatch(0, 2), file: null })).toThrow(/file/);
    expect(store.pulsars()).toEqual([]);
  });

  test('with a name that is not UTF-8 is known by its bytes, and look-alikes are distinct', () => {
    store.commitIntake(fileBatch(0, 1, { path: 'kr\\xFF.csv', pathBytesHex: '6b72FF2e637376' }));
    store.commitIntake(fileBatch(1, 1, { path: 'é.csv' }));
    store.commitIntake(fileBatch(2, 1, { path: 'é.csv'.normalize('NFD') }));
    store.commitIntake(fileBatch(3, 1, { path: 'É.csv' }));
    expect(store.knownFile('nightly', { bytesHex: '6b72ff2e637376' })?.path).toBe('kr\\xFF.csv');
    expect(store.knownFile('nightly', 'kr\\xFF.csv')).toBeNull();
    expect(keys(store.arrivalsOfFile('nightly', 'é.csv'.normalize('NFD')))).toEqual(['key-000002']);
    expect(keys(store.arrivalsOfFile('nightly', 'É.csv'))).toEqual(['key-000003']);
  });

  test('that kills its reader is found out', () => {
    expect(store.noteReadingStarts('nightly', 'night-1.csv', 'aa')).toBe(1);
    expect(store.noteReadingStarts('nightly', 'night-1.csv', 'aa')).toBe(2);
    expect(store.noteReadingStarts('nightly', 'night-1.csv', 'bb')).toBe(1);
    expect(store.noteReadingStarts('nightly', 'night-1.csv', 'bb')).toBe(2);
    store.commitIntake(fileBatch(0, 1));
    expect(store.noteReadingStarts('nightly', 'night-1.csv', 'bb')).toBe(1);
    expect(store.noteReadingStarts('nightly', { bytesHex: 'FF' }, 'bb')).toBe(1);
    store.commitIntake(fileBatch(1, 1, { path: '\\xFF', pathBytesHex: 'ff' }));
    expect(store.noteReadingStarts('nightly', { bytesHex: 'ff' }, 'bb')).toBe(1);
  });
});

describe('arrivals', () => {
  test('the same row in two files is one arrival and stands while either has it', () => {
    store.commitIntake(fileBatch(0, 2));
    const second = { ...emptyBatch(LATER), file: sampleFile(1, { path: 'copy.csv' }) };
    store.commitIntake({ ...second, sightings: [{ key: 'key-000001', line: 2 }] });
    expect(store.arrivals('KR 0417+31')).toHaveLength(2);
    const both = ['key-000000', 'key-000001'];
    expect(store.standingElsewhere(both, 'nightly', 'night-1.csv')).toEqual(new Set(['key-000001']));
    expect(store.standingElsewhere(both, 'nightly', 'copy.csv')).toEqual(new Set(both));
    store.commitIntake({ ...second, file: sampleFile(0, { path: 'copy.csv' }) });
    expect(store.standingElsewhere(both, 'nightly', 'night-1.csv')).toEqual(new Set());
  });

  test('the same row twice in one file is one arrival, seen twice', () => {
    store.commitIntake({ ...fileBatch(0, 1, { rows: 2 }), sightings: [{ key: 'key-000000', line: 9 }] });
    expect(store.knownFile('nightly', 'night-1.csv')).toMatchObject({ stored: 1, same: 1 });
    expect(store.arrivalsOfFile('nightly', 'night-1.csv')).toHaveLength(1);
  });

  test('a key that is on record is refused as new', () => {
    store.commitIntake(fileBatch(0, 1));
    expect(() => store.commitIntake(fileBatch(0, 1, { path: 'other.csv' }))).toThrow(/UNIQUE/);
    expect(store.knownFile('nightly', 'other.csv')).toBeNull();
  });

  test('near a time: across midnight, within the window only, and of that pulsar only', () => {
    const at = (n: number, day: number, fraction: number, pulsar = 'KR 0417+31') =>
      sampleArrival(n, { time: { day, fraction }, pulsar });
    const arrivals = [
      at(0, 60_000, 1 - 1e-6 / 86_400),
      at(1, 60_001, 0),
      at(2, 60_001, 3e-6 / 86_400),
      at(3, 60_001, 0, 'KR 2231-08'),
    ];
    store.commitIntake({ ...fileBatch(0, 0, { rows: 4 }), arrivals });
    const near = store.arrivalsNear('KR 0417+31', { day: 60_001, fraction: 0 }, 1.5e-6);
    expect(keys(near)).toEqual(['key-000000', 'key-000001']);
    expect(store.pulsars()).toEqual(['KR 0417+31', 'KR 2231-08']);
  });

  test('come by TDB and then key; one without a TDB by the time received', () => {
    const timed = (n: number, fraction: number) => ({
      ...sampleArrival(n, { time: { day: 60_000, fraction } }),
      barycentred: { ...sampleArrival(n).barycentred!, tdb: { day: 60_000, fraction } },
    });
    const arrivals = [
      timed(3, 0.5),
      timed(2, 0.5),
      timed(1, 0.25),
      { ...timed(4, 0.4), barycentred: null, quality: 'unusable' as const },
    ];
    store.commitIntake({ ...fileBatch(0, 0, { rows: 4 }), arrivals });
    expect(keys(store.arrivals('KR 0417+31'))).toEqual(['key-000001', 'key-000004', 'key-000002', 'key-000003']);
    expect(store.arrival('key-000004')).toMatchObject({ tdb: null, delays: null, quality: 'unusable' });
  });

  test('go to the detector when they are live and have a TDB', () => {
    const infinite = sampleArrival(1, { frequencyMhz: Number.POSITIVE_INFINITY, pulseNumber: 42 });
    const arrivals = [sampleArrival(2), infinite, { ...sampleArrival(3), barycentred: null }, sampleArrival(4)];
    store.commitIntake({
      ...fileBatch(0, 0, { rows: 4 }),
      arrivals,
      statusChanges: [{ key: 'key-000004', status: 'withdrawn', reason: 'gone' }],
    });
    const timed = store.timedArrivals('KR 0417+31');
    expect(keys(timed)).toEqual(['key-000001', 'key-000002']);
    expect(timed[0]).toEqual({
      key: 'key-000001',
      tdb: infinite.barycentred?.tdb,
      uncertaintyUs: 12.5,
      frequencyMhz: Number.POSITIVE_INFINITY,
      site: 'Kestrel Ridge',
      receiver: 'L-wide',
      pulseNumber: 42,
    });
    expect(timed[1]?.frequencyMhz).toBe(1400);
  });

  test('are brought to the barycentre anew without a file', () => {
    store.commitIntake(fileBatch(0, 2));
    const better = { ...sampleArrival(0).barycentred!, tdb: { day: 60_000, fraction: 0.2 } };
    store.commitIntake({
      ...emptyBatch(LATER),
      retimed: [
        { key: 'key-000000', barycentred: better, quality: 'extrapolated', qualityReasons: ['leap seconds end'] },
        { key: 'key-000001', barycentred: null, quality: 'unusable', qualityReasons: [] },
      ],
    });
    expect(store.arrival('key-000000')).toMatchObject({
      tdb: { day: 60_000, fraction: 0.2 },
      quality: 'extrapolated',
      qualityReasons: ['leap seconds end'],
    });
    expect(store.arrival('key-000001')).toMatchObject({ tdb: null, quality: 'unusable' });
  });
});

describe('a batch', () => {
  test('is whole or absent: a fault in its last part takes back its first', () => {
    store.commitIntake({ ...fileBatch(0, 1), events: [upsert()], messages: [sampleMessage()] });
    const before = store.outbox();
    const bad = {
      ...fileBatch(1, 2, { path: 'night-2.csv' }),
      statusChanges: [{ key: 'key-000000', status: 'withdrawn' as const, reason: 'gone' }],
      reports: [{ pulsar: 'KR 0417+31', basis: 'm', events: [], locked: true, noise: noNoise, lastArrivalMjd: null }],
      events: [upsert({ revision: 2, change: 'narrower' })],
      messages: [sampleMessage({ messageId: '<2@x>', eventId: 'no such event' })],
    };
    expect(() => store.commitIntake(bad)).toThrow(/FOREIGN KEY/);
    expect(store.knownFile('nightly', 'night-2.csv')).toBeNull();
    expect(store.arrival('key-000000')?.status).toBe('live');
    expect(store.pulsarReports()).toEqual([]);
    expect(store.event('KR0417-60003')?.revision).toBe(1);
    expect(store.outbox()).toEqual(before);
  });

  test('keeps the last report of each pulsar', () => {
    const report = {
      pulsar: 'KR 0417+31',
      basis: 'm1',
      events: [upsert().event],
      locked: false,
      noise: noNoise,
      lastArrivalMjd: 60_000.5,
    };
    store.commitIntake({ ...emptyBatch(AT), reports: [report] });
    store.commitIntake({ ...emptyBatch(LATER), reports: [{ ...report, basis: 'm2', locked: true }] });
    expect(store.pulsarReport('KR 0417+31')).toEqual({ ...report, basis: 'm2', locked: true });
    expect(store.pulsarReport('KR 2231-08')).toBeNull();
  });
});

const noNoise = { phaseWalk: 0, frequencyWalk: 1e-20, torqueWalk: 0, uncertaintyScale: 1.1, floorTurns: 0 };
