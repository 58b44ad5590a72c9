import { simpleParser } from 'mailparser';
import { describe, expect, test } from 'vitest';
import { morningReview } from '../../daemon/morning.ts';
import { createSelfAlerts } from '../../daemon/schedule/selfAlerts.ts';
import { emptyBatch } from '../../daemon/store/index.ts';
import type { TestStation } from '../support/station.ts';
import { stationForTest } from '../support/stationForTest.ts';
import { arrivalFile, syntheticArrivals, syntheticPulsar } from '../support/syntheticPulsar.ts';

// Trouble with the watch itself: told once when it begins, and not for as long as it lasts.

const pulsar = syntheticPulsar({ name: 'KR 0417+31', epochMjd: 61_000 });
const arrivals = syntheticArrivals(pulsar, { fromMjd: 61_001, toMjd: 61_040, everyDays: 4, seed: 5 });
const NOW = '2026-04-22T08:00:00.000Z';
const ROOM = 50e9;

async function rig(now = NOW) {
  const at = await stationForTest({ pulsars: [pulsar], now });
  let free = ROOM;
  const { run } = createSelfAlerts(at.station, { freeBytes: () => free });
  return {
    at,
    run,
    setFree: (bytes: number) => {
      free = bytes;
    },
    notices: () => at.store.outbox({ kind: 'notice' }).map(({ subject, recipient }) => `${recipient}: ${subject}`),
  };
}

async function lastText({ store }: TestStation): Promise<string> {
  let text = '';
  for (;;) {
    const mail = store.claimDue('2030-01-01T00:00:00.000Z');
    if (mail === null) return text.replace(/\s+/g, ' ');
    store.settle(mail.id, { kind: 'delivered', at: NOW });
    text = (await simpleParser(Buffer.from(mail.content, 'latin1'))).text ?? '';
  }
}

const both = (subject: string) => [
  `duty@kestrel-ridge.example: Kestrel Ridge · ${subject}`,
  `timing@kestrel-ridge.example: Kestrel Ridge · ${subject}`,
];

describe('the operators are told', () => {
  test('of nothing while all is well', async () => {
    const { at, run, notices } = await rig();
    await at.deliver('a.csv', arrivalFile(arrivals));
    expect(await run()).toBe(0);
    expect(notices()).toEqual([]);
  });

  test('A11: of files that could not be used, once a feed and day, with the first reason', async () => {
    const { at, run, notices } = await rig();
    await at.deliver('junk.csv', '\u0000\u0001\u0002\n\u0003');
    await at.deliver('mostly.csv', `${arrivalFile(arrivals.slice(0, 1))}nonsense\nnonsense\nnonsense\n`);
    expect(await run()).toBe(1);
    expect(notices()).toEqual(both('files could not be used'));
    expect(await lastText(at)).toMatch(/feed nightly: junk\.csv: .+ \(and 1 more of this feed\)/);
    at.setNow('2026-04-22T10:00:00.000Z');
    await at.deliver('junk2.csv', '\u0000');
    expect(await run()).toBe(0);
    at.setNow('2026-04-23T10:00:00.000Z');
    await at.deliver('junk3.csv', '\u0000');
    expect(await run()).toBe(1);
  });

  test('that the leap-second list expires soon', async () => {
    const { at, run, notices } = await rig();
    const tables = { ...at.station.tables, leapSeconds: { ...at.station.tables.leapSeconds, expiresMjd: 61_160 } };
    const soon = createSelfAlerts({ ...at.station, tables }, { freeBytes: () => ROOM });
    expect(await soon.run()).toBe(1);
    expect(await run()).toBe(0);
    expect(notices()).toEqual(both('a table is out of date'));
    expect(await lastText(at)).toContain('the leap-second list expires in 7 days (MJD 61160)');
  });

  test('that a clock table has ended', async () => {
    const { at, notices } = await rig();
    const table = { name: 'ridge', mjd: Float64Array.of(60_000, 61_140), addSeconds: Float64Array.of(0, 0) };
    const sites = [{ name: 'ridge', itrfM: [0, 0, 0], clockTable: table }] as const;
    const configuration = { ...at.station.configuration, sites };
    const { run } = createSelfAlerts({ ...at.station, configuration }, { freeBytes: () => ROOM });
    expect(await run()).toBe(1);
    expect(notices()).toEqual(both('a table is out of date'));
    expect(await lastText(at)).toContain('the clock table of ridge ended at MJD 61140');
  });

  test('that the disk is nearly full, once however it goes up and down; the morning review says it too', async () => {
    const { at, run, setFree, notices } = await rig();
    setFree(10e6);
    expect(await run()).toBe(1);
    expect(notices()).toEqual(both('the disk is nearly full'));
    for (const [hour, free] of [
      ['09', ROOM],
      ['10', 10e6],
      ['11', ROOM],
      ['20', 10e6],
    ] as const) {
      at.setNow(`2026-04-22T${hour}:00:00.000Z`);
      setFree(free);
      expect(await run()).toBe(0);
    }
    at.setNow('2026-04-24T09:00:00.000Z');
    expect(await run()).toBe(1);
    expect(await lastText(at)).toMatch(/only 10 MB are free where the record lies/);
    const { configuration, store, clock } = at.station;
    const review = morningReview({ configuration, store, clock, warnings: [], freeBytes: () => 10e6 });
    expect(review.warnings.join()).toMatch(/only 10 MB are free/);
  });

  test('of pulsars whose count is not settled, all in one mail; not of those that have just begun', async () => {
    const { at, run, notices } = await rig();
    await at.deliver('a.csv', arrivalFile(arrivals));
    const [known] = at.store.pulsarReports();
    const lost = (name: string, arrivalCount: number) => ({
      ...known!,
      pulsar: name,
      locked: false,
      arrivals: arrivalCount,
    });
    const reports = [lost('KR 0417+31', 60), lost('KR 1902-08', 200), lost('KR 2231+44', 5)];
    at.store.commitIntake({ ...emptyBatch(NOW), reports });
    expect(await run()).toBe(1);
    expect(notices()).toEqual(both('pulsars without a settled count: no alerts from these'));
    const text = await lastText(at);
    expect(text).toContain('KR 0417+31 KR 1902-08 ');
    expect(text).not.toContain('KR 2231+44');
  });

  test('D17: that mail to somebody has been waiting for an hour: the others', async () => {
    const { at, run, notices } = await rig();
    const message = { messageId: '<1@x>', kind: 'digest', eventId: null, subject: 's', inReplyTo: null } as const;
    const recipients = ['duty@kestrel-ridge.example'];
    at.store.commitDigest('2026-04-22', { ...message, recipients, content: '', dueAt: NOW }, NOW);
    const mail = at.store.claimDue(NOW)!;
    at.store.settle(mail.id, { kind: 'later', dueAt: '2026-04-22T08:10:00.000Z', error: '451 try later' });
    at.setNow('2026-04-22T08:30:00.000Z');
    expect(await run()).toBe(0);
    at.setNow('2026-04-22T09:01:00.000Z');
    expect(await run()).toBe(1);
    expect(notices()).toEqual(['timing@kestrel-ridge.example: Kestrel Ridge · mail does not reach everybody']);
    // The notice waits too, and is no trouble of its own.
    at.setNow('2026-04-22T12:00:00.000Z');
    expect(await run()).toBe(0);
  });

  test('once, across restarts', async () => {
    const { at, run, setFree } = await rig();
    setFree(10e6);
    expect(await run()).toBe(1);
    expect(await createSelfAlerts(at.restart().station, { freeBytes: () => 10e6 }).run()).toBe(0);
  });
});
