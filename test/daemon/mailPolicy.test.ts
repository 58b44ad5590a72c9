import { describe, expect, test } from 'vitest';
import { morningReview } from '../../daemon/morning.ts';
import { planAlerts } from '../../daemon/stages/alert.ts';
import type { KeptEvent } from '../../daemon/stages/eventChanges.ts';
import { emptyBatch } from '../../daemon/store/index.ts';
import type { PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import type { TestStation } from '../support/station.ts';
import { stationForTest } from '../support/stationForTest.ts';
import { arrivalFile } from '../support/syntheticPulsar.ts';
import { arrivals, deliverAll, NOW, pulsar, quietArrivals } from './alertedGlitch.ts';

// What the operator decides about mail: when it is held, how much of it leaves, who else gets it. Nothing is dropped silently.

function station(now = NOW, mailKeys: readonly string[] = []): Promise<TestStation> {
  return stationForTest({ pulsars: [pulsar], now, mailKeys });
}

/** So many new events at once, of the kind and size of the one that the file shows. */
async function eventsAtOnce(at: TestStation, count: number, what: Partial<PulsarEvent> = {}): Promise<KeptEvent[]> {
  await at.deliver('a.csv', arrivalFile(arrivals));
  const [{ event }] = at.store.events() as [ReturnType<typeof at.store.events>[number]];
  return Array.from({ length: count }, (_, i): KeptEvent => {
    const copy = { ...event, ...what, id: `storm-${i}` };
    return { event: copy, before: null, revision: 1, what: 'confirmed as glitch' };
  });
}

/** Plans the mail and writes it down, as the pipeline does. */
async function record(at: TestStation, changes: readonly KeptEvent[]) {
  const { messages, why } = await planAlerts(at.station, changes, () => null);
  at.store.commitIntake({
    ...emptyBatch(at.station.clock.now().toISOString()),
    events: changes.map(({ event, revision, what }) => ({
      event,
      picture: null,
      formerId: null,
      revision,
      change: what,
      alert: why.get(event.id) ?? null,
    })),
    messages,
  });
  return messages;
}

function morning({ station: { configuration, store, clock } }: TestStation) {
  return morningReview({ configuration, store, clock, warnings: [] });
}

describe('D12: a storm of events', () => {
  test('becomes ten mails and one summary; the morning review names the rest', async () => {
    const at = await station();
    const messages = await record(at, await eventsAtOnce(at, 13));
    const kinds = messages.map(({ kind }) => kind);
    expect(kinds).toEqual([...Array(10).fill('event'), 'notice']);
    expect(messages.at(-1)?.subject).toMatch(/^Kestrel Ridge · /);
    const { heldBack } = morning(at);
    expect(heldBack.map(({ event }) => event.id).sort()).toEqual(['storm-10', 'storm-11', 'storm-12']);
    for (const { why } of heldBack)
      expect(why).toMatch(/^(in the storm notice only|on the page only, in a storm): first/);
  });

  test('of 500 events: nothing more leaves within the hour, and the cap is the operator’s', async () => {
    const at = await station(NOW, ['most_per_hour = 3']);
    const [first, ...rest] = await eventsAtOnce(at, 500);
    const { messages } = await planAlerts(at.station, [first!, ...rest], () => null);
    expect(messages.map(({ kind }) => kind)).toEqual(['event', 'event', 'event', 'notice']);
  });
});

describe('quiet hours', () => {
  // Summer time in Berlin: 03:00 there is 01:00 UTC.
  const NIGHT = '2026-04-22T01:00:00.000Z';
  const MORNING = '2026-04-22T05:00:00.000Z';
  const QUIET = ['quiet_hours = "22:00-07:00"', 'quiet_hours_except_above = 1e-6'];

  test('hold a small event until they end, and the morning review says so', async () => {
    const at = await station(NIGHT, QUIET);
    await at.deliver('a.csv', arrivalFile(arrivals), { mail: true });
    expect(at.store.outbox()).toMatchObject([{ state: 'queued', dueAt: MORNING }]);
    expect(at.store.claimDue('2026-04-22T04:59:59.000Z')).toBeNull();
    expect(morning(at).heldBack.map(({ why }) => why)).toEqual([
      expect.stringMatching(/^held in the quiet hours until 07:00: first confirmation$/),
    ]);
    expect(morning(at).mail).toMatchObject({ waiting: 1, oldestWaitingHours: 0 });
    expect(at.store.claimDue(MORNING)).not.toBeNull();
  });

  test('let a large one through, and by day every one', async () => {
    const loud = await station(NIGHT, ['quiet_hours = "22:00-07:00"', 'quiet_hours_except_above = 1e-7']);
    await loud.deliver('a.csv', arrivalFile(arrivals), { mail: true });
    expect(loud.store.claimDue('2026-04-22T01:00:01.000Z')).not.toBeNull();
    expect(morning(loud).heldBack).toEqual([]);
    const day = await station(NOW, QUIET);
    await day.deliver('a.csv', arrivalFile(arrivals), { mail: true });
    expect(day.store.claimDue('2026-04-22T08:00:01.000Z')).not.toBeNull();
  });

  test('before midnight they end on the next day; over a change to summer time too', async () => {
    const evening = await station(NOW, QUIET);
    const changes = await eventsAtOnce(evening, 1);
    evening.setWallClock('2026-03-28T22:30:00.000Z');
    const { messages } = await planAlerts(evening.station, changes, () => null);
    // 23:30 on the 28th in winter time; 07:00 on the 29th in summer time.
    expect(messages.map(({ dueAt }) => dueAt)).toEqual(['2026-03-29T05:00:00.000Z']);
  });

  test('what a large event took to bed is taken back at once', async () => {
    const at = await station('2026-04-21T20:30:00.000Z', [
      'quiet_hours = "22:00-07:00"',
      'quiet_hours_except_above = 1e-7',
    ]);
    await at.deliver('a.csv', arrivalFile(arrivals), { mail: true });
    await deliverAll(at);
    at.setNow(NIGHT);
    await at.deliver('a.csv', arrivalFile(quietArrivals), { mail: true });
    expect(at.store.claimDue('2026-04-22T01:00:05.000Z')?.subject).toMatch(/^WITHDRAWN/);
  });

  test('news that replaces a mail that waits takes its place, also where no other mail may leave', async () => {
    const at = await station(NIGHT, [...QUIET, 'most_per_hour = 1']);
    await at.deliver('a.csv', arrivalFile(arrivals.slice(0, -2)), { mail: true });
    await at.deliver('b.csv', arrivalFile(arrivals.slice(-2)), { mail: true });
    const waiting = at.store.outbox({ state: 'queued' });
    expect(waiting.map(({ kind, dueAt }) => [kind, dueAt])).toEqual([['event', MORNING]]);
    expect(waiting[0]!.messageId).toContain(`.r${at.store.events()[0]!.revision}.first@`);
  });

  test('a night of many ends with as many mails as an hour may have, and a summary', async () => {
    const at = await station(NIGHT, [...QUIET, 'most_per_hour = 2']);
    const changes = await eventsAtOnce(at, 4);
    await record(at, changes.slice(0, 2));
    at.setNow('2026-04-22T03:00:00.000Z');
    await record(at, changes.slice(2));
    expect(at.store.outbox().map(({ kind, dueAt }) => [kind, dueAt])).toEqual([
      ['event', MORNING],
      ['event', MORNING],
      ['notice', MORNING],
    ]);
    expect(morning(at).heldBack).toHaveLength(4);
  });
});

describe('who else is told', () => {
  test('those who asked for such events or pulsars, and nobody else', async () => {
    const clocks = '[[mail.also_to]]\nto = ["clocks@kestrel-ridge.example"]\nexplanations = ["clock step"]';
    const ours =
      '[[mail.also_to]]\nto = ["ours@kestrel-ridge.example"]\nexplanations = ["glitch"]\npulsars = ["KR 0417+31"]';
    const at = await station(NOW, [clocks, ours]);
    await at.deliver('a.csv', arrivalFile(arrivals), { mail: true });
    expect(at.store.outbox().map(({ recipient }) => recipient)).toEqual([
      'duty@kestrel-ridge.example',
      'ours@kestrel-ridge.example',
    ]);
  });

  test('of a suspected event, where the operator asked for it: one thread from the suspicion on', async () => {
    const at = await station(NOW, ['mail_suspected = true']);
    const changes = await eventsAtOnce(at, 1, { state: 'suspected', confirmedAtMjd: null });
    await record(at, changes);
    const [suspicion] = await deliverAll(at);
    expect(suspicion!.parsed.subject).toMatch(/KR 0417\+31: suspected glitch/);
    expect(suspicion!.parsed.text).toMatch(/^Suspected only/m);
    const [listed] = at.store.events().filter(({ event }) => event.id === 'storm-0');
    const confirmed: KeptEvent = {
      event: { ...listed!.event, state: 'confirmed', confirmedAtMjd: 61_150 },
      before: listed!,
      revision: 2,
      what: 'suspected → confirmed',
    };
    const { messages } = await planAlerts(at.station, [confirmed], () => null);
    expect(messages).toMatchObject([{ inReplyTo: suspicion!.parsed.messageId }]);
    expect(messages[0]!.subject).toMatch(/^Update: .*candidate glitch/);
  });
});
