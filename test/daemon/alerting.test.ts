import { describe, expect, test } from 'vitest';
import { timeInWords } from '../../alerts/index.ts';
import { FIRST_START, reportSilences } from '../../daemon/schedule/silentFeeds.ts';
import type { TestStation } from '../support/station.ts';
import { stationForTest } from '../support/stationForTest.ts';
import { arrivalFile } from '../support/syntheticPulsar.ts';
import { arrivals, deliverAll, NOW, pulsar, quietArrivals } from './alertedGlitch.ts';

// From a file to the outbox: who is told, once, and what happens to mail that has not left yet.

const MONTHS_LATER = '2026-08-01T08:00:00.000Z';

function station(now = NOW, expectEveryHours?: number): Promise<TestStation> {
  const hours = expectEveryHours === undefined ? {} : { expectEveryHours };
  return stationForTest({ pulsars: [pulsar], now, ...hours });
}

const outbox = ({ store }: TestStation) => store.outbox().map(({ subject, state, kind }) => ({ subject, state, kind }));
const told = ({ store }: TestStation) => store.events().map((event) => [event.event.state, event.told]);

describe('an event', () => {
  test('is mailed when it is confirmed, with its picture, its notice and itself', async () => {
    const at = await station();
    await at.deliver('a.csv', arrivalFile(arrivals), { mail: true });
    const [sent, ...more] = await deliverAll(at);
    expect(more).toEqual([]);
    expect(sent!.parsed.subject).toMatch(/^Kestrel Ridge · KR 0417\+31: candidate glitch/);
    const attached = sent!.parsed.attachments.map(({ contentType }) => contentType);
    expect(attached.sort()).toEqual(['application/json', 'application/xml', 'image/png']);
    expect(told(at)).toEqual([['confirmed', true]]);
  });

  test('A21: of long ago wakes nobody', async () => {
    const at = await station(MONTHS_LATER);
    await at.deliver('a.csv', arrivalFile(arrivals), { mail: true });
    expect(told(at)).toEqual([['confirmed', false]]);
    expect(outbox(at)).toEqual([]);
  });

  test('is not mailed where no mail was asked for', async () => {
    const at = await station();
    await at.deliver('a.csv', arrivalFile(arrivals), { mail: false });
    expect(outbox(at)).toEqual([]);
  });

  test('keeps what was believed when, and why that was mailed or not; a later mail tells it', async () => {
    const at = await station();
    const sent = [];
    for (const [name, some] of [
      ['a.csv', arrivals.slice(0, -5)],
      ['b.csv', arrivals.slice(-5, -2)],
      ['c.csv', arrivals.slice(-2)],
    ] as const) {
      await at.deliver(name, arrivalFile(some), { mail: true });
      sent.push(...(await deliverAll(at)));
    }
    const [listed] = at.store.events() as [ReturnType<typeof at.store.events>[number]];
    const { history } = at.store.event(listed.event.id)!;
    const reasons = history.map(({ alert }) => alert);
    expect(history.length).toBeGreaterThan(1);
    expect(reasons[0]).toMatch(/^(mailed: first confirmation|not mailed: suspected only)$/);
    for (const why of reasons) expect(why).toMatch(/^(mailed|not mailed): [a-z]/);
    const arrivalsUsed = history.map(({ event }) => event.arrivalsUsed);
    expect(arrivalsUsed).toEqual([...arrivalsUsed].sort((a, b) => a - b));

    const mailed = history.filter(({ alert }) => alert?.startsWith('mailed: '));
    expect(sent.map(({ mail }) => /\.r(\d+)\./.exec(mail.messageId)?.[1])).toEqual(
      mailed.map((m) => String(m.revision)),
    );
    for (const [i, { parsed }] of sent.entries()) {
      expect(parsed.text!.includes('What was believed when')).toBe(mailed[i]!.revision > 1);
    }
  });

  test('D19: that changes before its mail left is told once, as it is now', async () => {
    const at = await station();
    await at.deliver('a.csv', arrivalFile(arrivals.slice(0, -2)), { mail: true });
    const before = outbox(at);
    expect(before.map(({ state }) => state)).toEqual(['queued']);
    await at.deliver('b.csv', arrivalFile(arrivals.slice(-2)), { mail: true });
    const revisions = at.store.events()[0]!.revision;
    expect(revisions).toBeGreaterThan(1);
    const sent = await deliverAll(at);
    expect(sent).toHaveLength(1);
    expect(sent[0]!.mail.messageId).toContain(`.r${revisions}.first@`);
  });

  test('A6, D19: whose rows are taken back is withdrawn in the same thread when it was told, and forgotten when not', async () => {
    const unheard = await station();
    await unheard.deliver('a.csv', arrivalFile(arrivals), { mail: true });
    await unheard.deliver('a.csv', arrivalFile(quietArrivals), { mail: true });
    expect(told(unheard)).toEqual([]);
    expect(await deliverAll(unheard)).toEqual([]);

    const heard = await station();
    await heard.deliver('a.csv', arrivalFile(arrivals), { mail: true });
    const [first] = await deliverAll(heard);
    await heard.deliver('a.csv', arrivalFile(quietArrivals), { mail: true });
    expect(told(heard)).toEqual([['withdrawn', true]]);
    const [withdrawal, ...more] = await deliverAll(heard);
    expect(more).toEqual([]);
    expect(withdrawal!.parsed.subject).toMatch(/^WITHDRAWN: /);
    expect(withdrawal!.parsed.inReplyTo).toBe(first!.parsed.messageId);

    // And the rows come back: the same record goes on, and so does the thread.
    await heard.deliver('a.csv', arrivalFile(arrivals), { mail: true });
    expect(told(heard)).toEqual([['confirmed', true]]);
    const [again] = await deliverAll(heard);
    expect(again!.parsed.inReplyTo).toBe(first!.parsed.messageId);
  });

  test('keeps the verdict of a person, whatever the detector goes on to find', async () => {
    const at = await station();
    await at.deliver('a.csv', arrivalFile(arrivals.slice(0, -2)), { mail: true });
    const [{ event, revision }] = at.store.events() as [ReturnType<typeof at.store.events>[number]];
    const verdict = { verdict: 'reject', by: 'duty', note: 'cable', at: NOW, expectedRevision: revision } as const;
    expect(at.store.recordVerdict(event.id, verdict).kind).toBe('recorded');
    await at.deliver('b.csv', arrivalFile(arrivals.slice(-2)), { mail: true });
    expect(told(at)).toEqual([['rejected', true]]);
    const mails = outbox(at);
    expect(mails).toHaveLength(1);
  });
});

describe('a feed that falls silent', () => {
  test('is reported once for each silence', async () => {
    const at = await station(NOW, 24);
    at.store.setMeta(FIRST_START, NOW);
    expect(await reportSilences(at.station)).toBe(0);
    at.setNow('2026-04-23T08:00:01.000Z');
    expect(await reportSilences(at.station)).toBe(1);
    at.setNow('2026-04-25T08:00:00.000Z');
    expect(await reportSilences(at.station)).toBe(0);
    await at.deliver('a.csv', arrivalFile(quietArrivals));
    expect(await reportSilences(at.station)).toBe(0);
    at.setNow('2026-04-26T09:00:00.000Z');
    expect(await reportSilences(at.station)).toBe(1);
    expect(outbox(at).map(({ subject }) => subject)).toEqual([
      'Kestrel Ridge · feed nightly has been silent for 24 h',
      'Kestrel Ridge · feed nightly has been silent for 24 h',
    ]);
  });

  test('is said in minutes, hours or days', async () => {
    const at = await station(NOW, 0.25);
    at.store.setMeta(FIRST_START, NOW);
    at.setNow('2026-04-22T08:20:00.000Z');
    expect(await reportSilences(at.station)).toBe(1);
    const [notice] = await deliverAll(at);
    expect(notice!.parsed.subject).toBe('Kestrel Ridge · feed nightly has been silent for 20 minutes');
    expect(notice!.parsed.text).toMatch(
      /expected to deliver every 15\s+minutes\. Nothing\s+has\s+come\s+for\s+20\s+minutes/,
    );
    expect([1 / 60, 0.999, 1, 1.5, 36, 47.9, 48, 300].map(timeInWords)).toEqual([
      '1 minute',
      '59 minutes',
      '1 h',
      '1.5 h',
      '36 h',
      '47 h',
      '2 days',
      '12 days',
    ]);
  });

  test('is not reported where nothing is expected of it', async () => {
    const at = await station(NOW);
    at.store.setMeta(FIRST_START, '2020-01-01T00:00:00.000Z');
    expect(await reportSilences(at.station)).toBe(0);
  });
});
