import { describe, expect, test } from 'vitest';
import { type HealthSources, watchHealth } from '../../daemon/health.ts';
import type { FeedStatus } from '../../daemon/watch/watcher.ts';
import { stationForTest } from '../support/stationForTest.ts';
import { arrivalFile, syntheticArrivals, syntheticPulsar } from '../support/syntheticPulsar.ts';

const NOW = '2026-04-22T08:30:00.000Z';
const pulsar = syntheticPulsar({ name: 'KR 0417+31', epochMjd: 61_000 });

async function rig(
  changes: { feed?: Partial<FeedStatus>; storage?: string; mail?: string; monotonicMs?: number } = {},
) {
  const at = await stationForTest({ pulsars: [pulsar], now: NOW });
  const { configuration, store, clock } = at.station;
  const status = { feed: 'nightly', lastLookMs: 0, files: 1, moving: 0, problems: [], ...changes.feed };
  const sources: HealthSources = {
    configuration,
    store,
    clock: { now: () => clock.now(), monotonicMs: () => changes.monotonicMs ?? 1000 },
    intake: { status: () => [status], storageTrouble: () => changes.storage ?? null },
    delivery: { trouble: () => changes.mail ?? null },
  };
  return { at, problems: () => watchHealth(sources).problems, ok: () => watchHealth(sources).ok };
}

describe('the health of the watch', () => {
  test('is well when nothing is wrong', async () => {
    const { ok, problems } = await rig();
    expect(problems()).toEqual([]);
    expect(ok()).toBe(true);
  });

  test('names a feed that is not looked at, or that is gone', async () => {
    expect((await rig({ monotonicMs: 301_000 })).problems()).toEqual([
      'Feed nightly has not been looked at for 5 minutes.',
    ]);
    const gone = {
      feed: 'nightly',
      kind: 'root gone',
      path: null,
      message: 'the folder /secret/place is gone',
    } as const;
    // The page is for people without an account here: no paths of this machine.
    expect((await rig({ feed: { problems: [gone] } })).problems()).toEqual(['Feed nightly: root gone.']);
  });

  test('A39: names a disk that is full', async () => {
    expect((await rig({ storage: 'database or disk is full' })).problems().join()).toMatch(/Nothing can be written/);
  });

  test('names mail that waits, and why', async () => {
    const { at, problems } = await rig({ mail: 'connection refused' });
    const message = { messageId: '<m@x>', kind: 'notice', eventId: null, subject: 's', inReplyTo: null } as const;
    at.store.commitNotice({ ...message, recipients: ['a@x.example'], content: '', dueAt: NOW }, NOW);
    expect(problems()).toEqual([]);
    at.setNow('2026-04-22T11:00:00.000Z');
    expect(problems()).toEqual(['Mail has been waiting for 2 h: connection refused.']);
  });

  test('names a pulsar that could not be decided about', async () => {
    const { at, problems } = await rig();
    await at.deliver(
      'a.csv',
      arrivalFile(syntheticArrivals(pulsar, { fromMjd: 61_001, toMjd: 61_050, everyDays: 4, seed: 1 })),
    );
    expect(problems()).toEqual([]);
    const report = at.store.pulsarReport('KR 0417+31')!;
    const { emptyBatch } = await import('../../daemon/store/index.ts');
    at.store.commitIntake({ ...emptyBatch(NOW), reports: [{ ...report, basis: 'left open: a fault' }] });
    expect(problems().join()).toMatch(/KR 0417\+31 could not be decided about/);
    expect(at.pipeline.undecided()).toEqual(['KR 0417+31']);
  });
});
