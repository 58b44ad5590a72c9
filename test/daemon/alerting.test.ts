import { simpleParser } from 'mailparser';
import { afterEach, describe, expect, test } from 'vitest';
import { timeInWords } from '../../alerts/index.ts';
import { morningReview } from '../../daemon/morning.ts';
import { FIRST_START, reportSilences } from '../../daemon/schedule/silentFeeds.ts';
import { planAlerts } from '../../daemon/stages/alert.ts';
import type { KeptEvent } from '../../daemon/stages/eventChanges.ts';
import { emptyBatch } from '../../daemon/store/index.ts';
import type { PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import { createTestStation, type TestStation } from '../support/station.ts';
import { arrivalFile, syntheticArrivals, syntheticPulsar } from '../support/syntheticPulsar.ts';

// From a file to the outbox: who is told, once, and what happens to mail that has not left yet.

const START = 61_000;
const GLITCH = START + 129;
const pulsar = syntheticPulsar({
  name: 'KR 0417+31',
  epochMjd: START,
  glitches: [{ mjd: GLITCH, deltaNuOverNu: 2e-7 }],
});
const span = { fromMjd: START + 1, toMjd: START + 150, everyDays: 3 };
const all = syntheticArrivals(pulsar, { ...span, seed: 3 });
const quietly = syntheticArrivals({ ...pulsar, glitches: [] }, { ...span, seed: 3 });
const NOW = '2026-04-22T08:00:00.000Z';
const MONTHS_LATER = '2026-08-01T08:00:00.000Z';

const open: TestStation[] = [];
afterEach(async () => {
  for (const station of open.splice(0)) await station.close();
});
async function station(now = NOW, expectEveryHours?: number, mailKeys: readonly string[] = []): Promise<TestStation> {
  const hours = expectEveryHours === undefined ? {} : { expectEveryHours };
  const made = await createTestStation({ pulsars: [pulsar], now, mailKeys, ...hours });
  open.push(made);
  return made;
}

const outbox = ({ store }: TestStation) => store.outbox().map(({ subject, state, kind }) => ({ subject, state, kind }));
const told = ({ store }: TestStation) => store.events().map((event) => [event.event.state, event.told]);

/** The delivery loop's part, without a mail server: everything that waits leaves. */
async function deliverAll(at: TestStation) {
  const sent = [];
  for (;;) {
    const mail = at.store.claimDue('2030-01-01T00:00:00.000Z');
    if (mail === null) return sent;
    at.store.settle(mail.id, { kind: 'delivered', at: at.station.clock.now().toISOString() });
    sent.push({ mail, parsed: await simpleParser(Buffer.from(mail.content, 'latin1')) });
  }
}

describe('an event', () => {
  test('is mailed when it is confirmed, with its picture, its notice and itself', async () => {
    const at = await station();
    await at.deliver('a.csv', arrivalFile(all), { mail: true });
    const [sent, ...more] = await deliverAll(at);
    expect(more).toEqual([]);
    expect(sent!.parsed.subject).toMatch(/^Kestrel Ridge · KR 0417\+31: candidate glitch/);
    const attached = sent!.parsed.attachments.map(({ contentType }) => contentType);
    expect(attached.sort()).toEqual(['application/json', 'application/xml', 'image/png']);
    expect(told(at)).toEqual([['confirmed', true]]);
  });

  test('A21: of long ago wakes nobody', async () => {
    const at = await station(MONTHS_LATER);
    await at.deliver('a.csv', arrivalFile(all), { mail: true });
    expect(told(at)).toEqual([['confirmed', false]]);
    expect(outbox(at)).toEqual([]);
  });

  test('is not mailed where no mail was asked for', async () => {
    const at = await station();
    await at.deliver('a.csv', arrivalFile(all), { mail: false });
    expect(outbox(at)).toEqual([]);
  });

  test('keeps what was believed when, and why that was mailed or not; a later mail tells it', async () => {
    const at = await station();
    const sent = [];
    for (const [name, some] of [
      ['a.csv', all.slice(0, -5)],
      ['b.csv', all.slice(-5, -2)],
      ['c.csv', all.slice(-2)],
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
    await at.deliver('a.csv', arrivalFile(all.slice(0, -2)), { mail: true });
    const before = outbox(at);
    expect(before.map(({ state }) => state)).toEqual(['queued']);
    await at.deliver('b.csv', arrivalFile(all.slice(-2)), { mail: true });
    const revisions = at.store.events()[0]!.revision;
    expect(revisions).toBeGreaterThan(1);
    const sent = await deliverAll(at);
    expect(sent).toHaveLength(1);
    expect(sent[0]!.mail.messageId).toContain(`.r${revisions}.first@`);
  });

  test('A6, D19: whose rows are taken back is withdrawn in the same thread when it was told, and forgotten when not', async () => {
    const unheard = await station();
    await unheard.deliver('a.csv', arrivalFile(all), { mail: true });
    await unheard.deliver('a.csv', arrivalFile(quietly), { mail: true });
    expect(told(unheard)).toEqual([]);
    expect(await deliverAll(unheard)).toEqual([]);

    const heard = await station();
    await heard.deliver('a.csv', arrivalFile(all), { mail: true });
    const [first] = await deliverAll(heard);
    await heard.deliver('a.csv', arrivalFile(quietly), { mail: true });
    expect(told(heard)).toEqual([['withdrawn', true]]);
    const [withdrawal, ...more] = await deliverAll(heard);
    expect(more).toEqual([]);
    expect(withdrawal!.parsed.subject).toMatch(/^WITHDRAWN: /);
    expect(withdrawal!.parsed.inReplyTo).toBe(first!.parsed.messageId);

    // And the rows come back: the same record goes on, and so does the thread.
    await heard.deliver('a.csv', arrivalFile(all), { mail: true });
    expect(told(heard)).toEqual([['confirmed', true]]);
    const [again] = await deliverAll(heard);
    expect(again!.parsed.inReplyTo).toBe(first!.parsed.messageId);
  });

  test('keeps the verdict of a person, whatever the detector goes on to find', async () => {
    const at = await station();
    await at.deliver('a.csv', arrivalFile(all.slice(0, -2)), { mail: true });
    const [{ event, revision }] = at.store.events() as [ReturnType<typeof at.store.events>[number]];
    const verdict = { verdict: 'reject', by: 'duty', note: 'cable', at: NOW, expectedRevision: revision } as const;
    expect(at.store.recordVerdict(event.id, verdict).kind).toBe('recorded');
    await at.deliver('b.csv', arrivalFile(all.slice(-2)), { mail: true });
    expect(told(at)).toEqual([['rejected', true]]);
    const mails = outbox(at);
    expect(mails).toHaveLength(1);
  });
});

/** So many new events at once, of the kind and size of the one that the file shows. */
async function eventsAtOnce(at: TestStation, count: number, what: Partial<PulsarEvent> = {}): Promise<KeptEvent[]> {
  await at.deliver('a.csv', arrivalFile(all));
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
    const at = await station(NOW, undefined, ['most_per_hour = 3']);
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
    const at = await station(NIGHT, undefined, QUIET);
    await at.deliver('a.csv', arrivalFile(all), { mail: true });
    expect(at.store.outbox()).toMatchObject([{ state: 'queued', dueAt: MORNING }]);
    expect(at.store.claimDue('2026-04-22T04:59:59.000Z')).toBeNull();
    expect(morning(at).heldBack.map(({ why }) => why)).toEqual([
      expect.stringMatching(/^held in the quiet hours until 07:00: first confirmation$/),
    ]);
    expect(morning(at).mail).toMatchObject({ waiting: 1, oldestWaitingHours: 0 });
    expect(at.store.claimDue(MORNING)).not.toBeNull();
  });

  test('let a large one through, and by day every one', async () => {
    const loud = await station(NIGHT, undefined, ['quiet_hours = "22:00-07:00"', 'quiet_hours_except_above = 1e-7']);
    await loud.deliver('a.csv', arrivalFile(all), { mail: true });
    expect(loud.store.claimDue('2026-04-22T01:00:01.000Z')).not.toBeNull();
    expect(morning(loud).heldBack).toEqual([]);
    const day = await station(NOW, undefined, QUIET);
    await day.deliver('a.csv', arrivalFile(all), { mail: true });
    expect(day.store.claimDue('2026-04-22T08:00:01.000Z')).not.toBeNull();
  });

  test('before midnight they end on the next day; over a change to summer time too', async () => {
    const evening = await station(NOW, undefined, QUIET);
    const changes = await eventsAtOnce(evening, 1);
    evening.setWallClock('2026-03-28T22:30:00.000Z');
    const { messages } = await planAlerts(evening.station, changes, () => null);
    // 23:30 on the 28th in winter time; 07:00 on the 29th in summer time.
    expect(messages.map(({ dueAt }) => dueAt)).toEqual(['2026-03-29T05:00:00.000Z']);
  });

  test('what a large event took to bed is taken back at once', async () => {
    const at = await station('2026-04-21T20:30:00.000Z', undefined, [
      'quiet_hours = "22:00-07:00"',
      'quiet_hours_except_above = 1e-7',
    ]);
    await at.deliver('a.csv', arrivalFile(all), { mail: true });
    await deliverAll(at);
    at.setNow(NIGHT);
    await at.deliver('a.csv', arrivalFile(quietly), { mail: true });
    expect(at.store.claimDue('2026-04-22T01:00:05.000Z')?.subject).toMatch(/^WITHDRAWN/);
  });

  test('news that replaces a mail that waits takes its place, also where no other mail may leave', async () => {
    const at = await station(NIGHT, undefined, [...QUIET, 'most_per_hour = 1']);
    await at.deliver('a.csv', arrivalFile(all.slice(0, -2)), { mail: true });
    await at.deliver('b.csv', arrivalFile(all.slice(-2)), { mail: true });
    const waiting = at.store.outbox({ state: 'queued' });
    expect(waiting.map(({ kind, dueAt }) => [kind, dueAt])).toEqual([['event', MORNING]]);
    expect(waiting[0]!.messageId).toContain(`.r${at.store.events()[0]!.revision}.first@`);
  });

  test('a night of many ends with as many mails as an hour may have, and a summary', async () => {
    const at = await station(NIGHT, undefined, [...QUIET, 'most_per_hour = 2']);
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
    const at = await station(NOW, undefined, [clocks, ours]);
    await at.deliver('a.csv', arrivalFile(all), { mail: true });
    expect(at.store.outbox().map(({ recipient }) => recipient)).toEqual([
      'duty@kestrel-ridge.example',
      'ours@kestrel-ridge.example',
    ]);
  });

  test('of a suspected event, where the operator asked for it: one thread from the suspicion on', async () => {
    const at = await station(NOW, undefined, ['mail_suspected = true']);
    const changes = await eventsAtOnce(at, 1, { state: 'suspected', confirmedAtMjd: null });
    await record(at, changes);
    const [suspicion] = await deliverAll(at);
    expect(suspicion!.parsed.subject).toMatch(/KR 0417\+31: suspected glitch/);
    expect(suspicion!.parsed.text).toMatch(/^Suspected only/m);
    const [listed] = at.store.events().filter(({ event }) => event.id === 'storm-0');
    const confirmed: KeptEvent = {
      event: { ...listed!.event, state: 'confirmed', confirmedAtMjd: START + 150 },
      before: listed!,
      revision: 2,
      what: 'suspected → confirmed',
    };
    const { messages } = await planAlerts(at.station, [confirmed], () => null);
    expect(messages).toMatchObject([{ inReplyTo: suspicion!.parsed.messageId }]);
    expect(messages[0]!.subject).toMatch(/^Update: .*candidate glitch/);
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
    await at.deliver('a.csv', arrivalFile(quietly));
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
