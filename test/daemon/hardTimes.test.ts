import { describe, expect, test } from 'vitest';
import { stationForTest } from '../support/stationForTest.ts';
import { arrivalFile } from '../support/syntheticPulsar.ts';
import { arrivals, deliverAll, NOW, pulsar, quietArrivals } from './alertedGlitch.ts';

// A feed that changes its mind again and again, and a machine that does not know the time yet.

const PATIENCE_MS = 300_000;
const MOST_MAILS_AN_HOUR = 10;

test('D13: a feed that flaps is one thread, of at most as many mails as an hour may have', {
  timeout: PATIENCE_MS,
}, async () => {
  const at = await stationForTest({ pulsars: [pulsar], now: NOW });
  const mails = [];
  const changes = 14;
  for (let i = 0; i < changes; i++) {
    await at.deliver('a.csv', arrivalFile(i % 2 === 0 ? arrivals : quietArrivals), { mail: true });
    // What was queued has left before the feed changes again: nothing can be replaced or taken back.
    mails.push(...(await deliverAll(at)));
  }
  const ofEvent = mails.filter(({ mail }) => mail.kind === 'event');
  expect(ofEvent.length).toBeGreaterThan(1);
  expect(mails.length).toBeLessThanOrEqual(MOST_MAILS_AN_HOUR + 1);
  const [first, ...others] = ofEvent.map(({ parsed }) => parsed);
  for (const { inReplyTo } of others) expect(inReplyTo).toBe(first!.messageId);
  // One event went and came back; what was not mailed stands in its history.
  expect(at.store.events()).toHaveLength(1);
  const { history } = at.store.event(at.store.events()[0]!.event.id)!;
  expect(history.length).toBeGreaterThanOrEqual(changes);
  expect(history.every(({ alert }) => alert !== null)).toBe(true);
});

describe('B8: started before the time is known', () => {
  const BEFORE = '1970-01-01T00:05:00.000Z';

  test('arrivals wait, nobody is told, and all is as ever once the clock is set', {
    timeout: PATIENCE_MS,
  }, async () => {
    const at = await stationForTest({ pulsars: [pulsar], now: BEFORE });
    const content = arrivalFile(arrivals);
    await at.deliver('a.csv', content, { mail: true });
    expect(at.store.liveArrivals(pulsar.name)).toEqual([]);
    expect(at.store.recentQuarantine(1)).toMatchObject([{ reason: expect.stringMatching(/future|time has come/) }]);
    expect(at.store.outbox()).toEqual([]);

    at.setWallClock(NOW);
    await at.deliver('a.csv', content, { mail: true });
    const undisturbed = await stationForTest({ pulsars: [pulsar], now: NOW });
    await undisturbed.deliver('a.csv', content, { mail: true });
    const events = ({ store }: typeof at) => store.events().map(({ event }) => event);
    expect(events(at)).toHaveLength(1);
    expect(events(at)).toEqual(events(undisturbed));
    const mail = ({ store }: typeof at) =>
      store.outbox().map(({ subject, recipient, state }) => [subject, recipient, state]);
    expect(mail(at)).toEqual(mail(undisturbed));
    expect(at.store.verify()).toEqual([]);
  });
});
