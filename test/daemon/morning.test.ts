import { describe, expect, test } from 'vitest';
import type { MorningReview } from '../../alerts/index.ts';
import { morningReview } from '../../daemon/morning.ts';
import type { TestStation } from '../support/station.ts';
import { stationForTest } from '../support/stationForTest.ts';
import { arrivalFile, syntheticArrivals, syntheticPulsar } from '../support/syntheticPulsar.ts';

const START = 61_000;
const pulsar = syntheticPulsar({
  name: 'KR 0417+31',
  epochMjd: START,
  glitches: [{ mjd: START + 100, deltaNuOverNu: 2e-7 }],
});
const arrivals = syntheticArrivals(pulsar, { fromMjd: START + 1, toMjd: START + 150, everyDays: 4, seed: 5 });
/** MJD 61152; the last arrival is from 61150. */
const NOW = '2026-04-22T08:30:00.000Z';

async function station(options: { digestCron?: string } = {}): Promise<TestStation> {
  return stationForTest({ pulsars: [pulsar], now: NOW, ...options });
}

function morning({ station: { configuration, store, clock } }: TestStation, date?: string): MorningReview {
  return morningReview({ configuration, store, clock, warnings: ['a table ends soon'] }, date);
}

describe('the morning review', () => {
  test('shows what waits, what came in and what was quarantined', async () => {
    const at = await station();
    await at.deliver('a.csv', `${arrivalFile(arrivals)}nonsense\n`);
    const review = morning(at);
    expect(review.observatory).toBe('Kestrel Ridge');
    expect(review.waiting.map(({ pulsar: name }) => name)).toEqual(['KR 0417+31']);
    expect(review.intake).toEqual({ files: 1, arrivals: arrivals.length, pulsars: 1 });
    expect(review.quarantined).toHaveLength(1);
    expect(review.warnings).toContain('a table ends soon');
    expect(review.mail).toEqual({ waiting: 0, oldestWaitingHours: null, undelivered: [] });
  });

  test('covers the time from the digest before, also after the one of today was made', async () => {
    const at = await station();
    expect(morning(at)).toMatchObject({ date: '2026-04-22', since: '2026-04-21T06:00:00.000Z', until: NOW });
    const message = { messageId: '<digest@x>', kind: 'digest', eventId: null, subject: 's', inReplyTo: null } as const;
    at.store.commitDigest(
      '2026-04-22',
      { ...message, recipients: [], content: '', dueAt: NOW },
      '2026-04-22T06:00:01.000Z',
    );
    expect(morning(at).since).toBe('2026-04-21T06:00:00.000Z');
  });

  test('covers a weekend, and days of downtime', async () => {
    const weekdays = await station({ digestCron: '0 8 * * 1-5' });
    weekdays.setNow('2026-04-20T06:00:00.000Z'); // a Monday
    expect(morning(weekdays).since).toBe('2026-04-17T06:00:00.000Z');

    const at = await station();
    const message = { messageId: '<digest@x>', kind: 'digest', eventId: null, subject: 's', inReplyTo: null } as const;
    at.store.commitDigest(
      '2026-04-15',
      { ...message, recipients: [], content: '', dueAt: NOW },
      '2026-04-15T06:00:01.000Z',
    );
    expect(morning(at).since).toBe('2026-04-15T06:00:01.000Z');
  });

  test('of a date gone by ends with its own digest, over a change to summer time too', async () => {
    const at = await station();
    expect(morning(at, '2026-03-29')).toMatchObject({
      date: '2026-03-29',
      since: '2026-03-28T07:00:00.000Z',
      until: '2026-03-29T06:00:00.000Z',
    });
  });

  test('misses a pulsar after five of its usual gaps, and forgets it after half a year', async () => {
    const at = await station();
    await at.deliver('a.csv', arrivalFile(arrivals));
    expect(morning(at).silentPulsars).toEqual([]);
    at.setNow('2026-05-20T08:00:00.000Z');
    expect(morning(at).silentPulsars).toMatchObject([{ pulsar: 'KR 0417+31' }]);
    const lastMjd = Number(arrivals.at(-1)!.mjdText);
    expect(morning(at).silentPulsars[0]!.daysSilent).toBeCloseTo(61_180 + 8 / 24 - lastMjd, 6);
    at.setNow('2026-12-01T08:00:00.000Z');
    expect(morning(at).silentPulsars).toEqual([]);
  });

  test('warns of a clock table that ran out', async () => {
    const at = await station();
    const { configuration, store, clock } = at.station;
    const table = { name: 'ridge', mjd: Float64Array.of(60_000, 61_140), addSeconds: Float64Array.of(0, 0) };
    const site = { name: 'ridge', itrfM: [0, 0, 0], clockTable: table } as const;
    const review = morningReview({ configuration: { ...configuration, sites: [site] }, store, clock, warnings: [] });
    expect(review.warnings.join()).toMatch(/the clock table of ridge ends at MJD 61140, 12 days ago/);
  });
});
