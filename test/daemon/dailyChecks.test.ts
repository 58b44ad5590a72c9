import { simpleParser } from 'mailparser';
import { describe, expect, test, vi } from 'vitest';
import { morningReview } from '../../daemon/morning.ts';
import { createDailyChecks } from '../../daemon/schedule/dailyChecks.ts';
import { stationForTest } from '../support/stationForTest.ts';
import { arrivalFile, syntheticArrivals, syntheticPulsar } from '../support/syntheticPulsar.ts';

const pulsar = syntheticPulsar({ name: 'KR 0417+31', epochMjd: 61_000 });
const arrivals = syntheticArrivals(pulsar, { fromMjd: 61_001, toMjd: 61_040, everyDays: 4, seed: 5 });

async function rig() {
  const at = await stationForTest({ pulsars: [pulsar], now: '2026-04-22T08:00:00.000Z' });
  const asked = vi.fn(() => ['the leap-second list expires in 3 days']);
  const { run } = createDailyChecks(at.station, asked);
  const { configuration, store, clock } = at.station;
  const warnings = () => morningReview({ configuration, store, clock, warnings: [] }).warnings;
  return { at, run, asked, warnings, verified: vi.spyOn(store, 'verifyBeside') };
}

describe('the daily checks', () => {
  test('B6: are made once a day, across restarts, and also after the wall clock was set back', async () => {
    const { at, run, asked, warnings, verified } = await rig();
    await at.deliver('a.csv', arrivalFile(arrivals));
    expect(await run()).toBe(0);
    expect(await run()).toBe(0);
    expect(await createDailyChecks(at.restart().station, asked).run()).toBe(0);
    expect([asked.mock.calls.length, verified.mock.settledResults.map(({ value }) => value)]).toEqual([1, [[]]]);
    at.setNow('2026-04-23T08:00:02.000Z');
    await run();
    expect(asked).toHaveBeenCalledTimes(2);
    at.setWallClock('2026-04-01T00:00:00.000Z');
    await run();
    expect(asked).toHaveBeenCalledTimes(3);
    expect(warnings()).toEqual([]);
    expect(at.store.outbox()).toEqual([]);
  });

  test('tell of trouble in the record once, and each morning until it is over', async () => {
    const { at, run, warnings, verified } = await rig();
    verified.mockResolvedValue(['nightly/a.csv revision 1: its rows do not add up', 'another']);
    expect(await run()).toBe(1);
    const mail = at.store.claimDue('2030-01-01T00:00:00.000Z')!;
    expect(mail.subject).toBe('Kestrel Ridge · the daily check of the record found trouble');
    const { text } = await simpleParser(Buffer.from(mail.content, 'latin1'));
    expect(text).toContain('nightly/a.csv revision 1: its rows do not add up');
    for (const day of [23, 24]) {
      at.setNow(`2026-04-${day}T09:00:00.000Z`);
      expect(await run()).toBe(0);
      expect(warnings()).toEqual([
        'the daily check of the record found trouble: nightly/a.csv revision 1: its rows do not add up, and 1 more; check the disk and the backups',
      ]);
    }
    verified.mockResolvedValue([]);
    at.setNow('2026-04-25T10:00:00.000Z');
    expect(await run()).toBe(0);
    expect(warnings()).toEqual([]);
    expect(at.store.outbox()).toHaveLength(1);
  });
});
