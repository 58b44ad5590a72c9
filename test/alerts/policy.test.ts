import { describe, expect, it } from 'vitest';
import {
  type AlertPolicy,
  type EventChanged,
  hasExpired,
  mailOrSummary,
  messagesFor,
  pauseMs,
} from '../../alerts/index.ts';
import { domainOf, messageId, namedMessageId } from '../../alerts/messageId.ts';
import type { PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import { GLITCH, SITE_STEP } from './samples.ts';

const POLICY: AlertPolicy = {
  to: ['duty@kestrel-ridge.example', 'timing@kestrel-ridge.example'],
  extraRecipients: [],
  contact: 'duty@kestrel-ridge.example',
  nowMjd: 60_128,
  historicalDays: 30,
  sharperBy: 2,
};
const HEARD = ['duty@kestrel-ridge.example', 'gone@kestrel-ridge.example'];
const FIRST_ID = '<first@kestrel-ridge.example>';

const suspected: PulsarEvent = { ...GLITCH, state: 'suspected', confirmedAtMjd: null };
const withdrawn: PulsarEvent = { ...GLITCH, state: 'withdrawn' };
const accepted: PulsarEvent = { ...GLITCH, state: 'accepted' };
const rejected: PulsarEvent = { ...GLITCH, state: 'rejected' };
const clock: PulsarEvent = { ...GLITCH, explanation: 'clock step' };
const term = {
  fraction: 0.02,
  fractionInterval68: [0.01, 0.03],
  timescaleDays: 18,
  timescaleDaysInterval68: [12, 25],
} as const;
const recovering: PulsarEvent = { ...GLITCH, recovery: { terms: [term], q: 0.02 } };
const narrowed = (factor: number): PulsarEvent => ({
  ...GLITCH,
  deltaNuHzInterval68: [2.03e-8 - 1.3e-9 / factor, 2.03e-8 + 1.3e-9 / factor],
});

const torque = (interval: readonly [number, number]): PulsarEvent => ({ ...GLITCH, deltaNuDotInterval68: interval });
const sharperRecovery: PulsarEvent = {
  ...GLITCH,
  recovery: { terms: [{ ...term, timescaleDaysInterval68: [15, 21] }], q: 0.02 },
};
const withAlias = (probability: number): PulsarEvent => ({
  ...GLITCH,
  aliases: [
    { deltaNuHz: 2.03e-8, probability: 1 - probability },
    { deltaNuHz: 9e-6, probability },
  ],
});
const aliased = withAlias(0.2);
const hardlyAliased = withAlias(0.001);

function decide(
  before: PulsarEvent | null,
  after: PulsarEvent,
  toldAs: PulsarEvent | null,
  policy: Partial<AlertPolicy> = {},
) {
  const told: EventChanged['told'] =
    toldAs === null ? null : { firstMessageId: FIRST_ID, as: toldAs, recipients: HEARD };
  return messagesFor({ before, after, told, revision: 3 }, { ...POLICY, ...policy });
}

describe('whom to tell, and why', () => {
  it.each([
    ['a suspected event', null, suspected, null, 'suspected only', null],
    ['the confirmation', suspected, GLITCH, null, 'first confirmation', 'first'],
    ['a site event', null, SITE_STEP, null, 'first confirmation', 'first'],
    ['nothing new', GLITCH, GLITCH, GLITCH, 'nothing new', null],
    ['a size a little sharper', GLITCH, narrowed(1.9), GLITCH, 'nothing new', null],
    ['a size twice as sharp', GLITCH, narrowed(2.1), GLITCH, 'size sharpened', 'update'],
    [
      'a size twice as sharp as when told, though hardly sharper than before',
      narrowed(2),
      narrowed(2.1),
      GLITCH,
      'size sharpened',
      'update',
    ],
    ['a first recovery', GLITCH, recovering, GLITCH, 'recovery first established', 'update'],
    ['a recovery that was told', recovering, recovering, recovering, 'nothing new', null],
    [
      'a spin-down step, once its sign is known',
      GLITCH,
      torque([-1.6e-15, -0.6e-15]),
      GLITCH,
      'spin-down step sharpened',
      'update',
    ],
    ['a spin-down step whose sign is open', GLITCH, torque([-1.1e-15, 0.1e-15]), GLITCH, 'nothing new', null],
    [
      'an epoch twice as sharp',
      GLITCH,
      { ...GLITCH, epochInterval68: [60_123.3, 60_123.6] },
      GLITCH,
      'epoch sharpened',
      'update',
    ],
    ['a recovery twice as sharp', recovering, sharperRecovery, recovering, 'recovery sharpened', 'update'],
    ['an alias that fell', aliased, GLITCH, aliased, 'alias fell', 'update'],
    ['an alias that hardly counted', hardlyAliased, GLITCH, hardlyAliased, 'nothing new', null],
    ['another explanation', GLITCH, clock, GLITCH, 'explanation changed', 'update'],
    ['withdrawn after it was told', GLITCH, withdrawn, GLITCH, 'withdrawn after it was told', 'withdrawal'],
    ['still withdrawn', withdrawn, withdrawn, withdrawn, 'nothing new', null],
    ['withdrawn before anyone was told', GLITCH, withdrawn, null, 'withdrawn before it was told', null],
    ['confirmed once more', withdrawn, GLITCH, withdrawn, 'confirmed again', 'update'],
    ['accepted', GLITCH, accepted, GLITCH, 'verdict', null],
    ['rejected', GLITCH, rejected, GLITCH, 'verdict', null],
    ['more data after a rejection', rejected, { ...rejected, recovery: recovering.recovery }, GLITCH, 'verdict', null],
    [
      'a recovery after it was accepted',
      accepted,
      { ...accepted, recovery: recovering.recovery },
      GLITCH,
      'recovery first established',
      'update',
    ],
    ['a bad arrival', null, { ...GLITCH, explanation: 'bad arrival' }, null, 'in the digest only', null],
    ['a bad session', null, { ...GLITCH, explanation: 'bad session' }, null, 'in the digest only', null],
  ] as const)('%s', (_name, before, after, told, reason, kind) => {
    const decision = decide(before, after, told);
    expect(decision.reason).toBe(reason);
    expect(decision.messages.map((m) => m.kind)).toEqual(kind === null ? [] : [kind]);
  });

  it('the factor is the operator’s', () => {
    expect(decide(GLITCH, narrowed(2.1), GLITCH, { sharperBy: 3 }).reason).toBe('nothing new');
    expect(decide(GLITCH, narrowed(3.1), GLITCH, { sharperBy: 3 }).reason).toBe('size sharpened');
    expect(decide(GLITCH, narrowed(1.3), GLITCH, { sharperBy: 1.2 }).reason).toBe('size sharpened');
  });

  it('A21, A33: what old arrivals confirm waits for the digest, so that a first start is no storm', () => {
    expect(decide(null, GLITCH, null, { nowMjd: 60_127.1 + 30.01 })).toEqual({ reason: 'historical', messages: [] });
    expect(decide(null, GLITCH, null, { nowMjd: 60_127.1 + 29.9 }).messages).toHaveLength(1);
    expect(decide(GLITCH, withdrawn, GLITCH, { nowMjd: 61_000 }).messages).toHaveLength(1);
  });

  it('updates thread under the first message; each revision has its own id', () => {
    const [first] = decide(suspected, GLITCH, null).messages;
    const [update] = decide(GLITCH, recovering, GLITCH).messages;
    expect(first).toMatchObject({ inReplyTo: null, recipients: POLICY.to, revision: 3, eventId: GLITCH.id });
    expect(update?.inReplyTo).toBe(FIRST_ID);
    expect(update?.messageId).not.toBe(first?.messageId);
  });

  it('a pulsar may have recipients of its own, each once', () => {
    const extra = { extraRecipients: ['x@kestrel-ridge.example', 'duty@kestrel-ridge.example'] };
    expect(decide(suspected, GLITCH, null, extra).messages[0]?.recipients).toEqual([
      ...POLICY.to,
      'x@kestrel-ridge.example',
    ]);
    expect(decide(suspected, GLITCH, null, { to: [] }).messages).toEqual([]);
  });
});

describe('suspected events, where the operator asked for them', () => {
  const asked = { mailSuspected: true };

  it.each([
    ['the suspicion', null, suspected, null, 'first suspicion', 'first'],
    ['more of the same', suspected, suspected, suspected, 'suspected only', null],
    ['the confirmation', suspected, GLITCH, suspected, 'confirmed after suspicion', 'update'],
    ['what came to nothing', suspected, withdrawn, suspected, 'withdrawn after it was told', 'withdrawal'],
    ['confirmed at once', null, GLITCH, null, 'first confirmation', 'first'],
    ['a bad arrival', null, { ...suspected, explanation: 'bad arrival' }, null, 'in the digest only', null],
  ] as const)('%s', (_name, before, after, told, reason, kind) => {
    const decision = decide(before, after, told, asked);
    expect([decision.reason, ...decision.messages.map((m) => m.kind)]).toEqual(
      kind === null ? [reason] : [reason, kind],
    );
  });

  it('A21: of long ago wakes nobody', () => {
    expect(decide(null, suspected, null, { ...asked, nowMjd: GLITCH.suspectedAtMjd + 31 }).reason).toBe('historical');
  });
});

describe('D18: a recipient who was taken out of the configuration, or added', () => {
  const newcomer = { to: ['new@kestrel-ridge.example'] };
  const to = (after: PulsarEvent) => decide(GLITCH, after, GLITCH, newcomer).messages[0]?.recipients;

  it('a withdrawal goes to those who heard of the event, and to nobody else', () => {
    expect(to(withdrawn)).toEqual(HEARD);
  });

  it('another explanation takes back what was said: it goes to those who heard it too', () => {
    expect(to(clock)).toEqual([...newcomer.to, ...HEARD]);
  });

  it('other updates go to those of today', () => {
    expect(to(recovering)).toEqual(newcomer.to);
  });
});

describe('D12: a storm', () => {
  it('500 events in an hour: ten mails, one summary, the rest on the page; a withdrawal still goes out', () => {
    const [first] = decide(suspected, GLITCH, null).messages;
    const [withdrawal] = decide(GLITCH, withdrawn, GLITCH).messages;
    if (!first || !withdrawal) throw new Error('no message planned');
    const sent = { mail: 0, summary: 0, 'page only': 0 };
    for (let i = 0; i < 500; i++)
      sent[mailOrSummary(first, { eventMails: sent.mail, summarySent: sent.summary > 0 })]++;
    expect(sent).toEqual({ mail: 10, summary: 1, 'page only': 489 });
    expect(mailOrSummary(withdrawal, { eventMails: 500, summarySent: true })).toBe('mail');
  });
});

describe('Message-ID', () => {
  it('is fixed by event, revision and kind, and is a legal one whatever the names are', () => {
    const of = (eventId: string, contact = 'duty@kestrel-ridge.example') =>
      messageId({ eventId, revision: 2, kind: 'update', contact });
    expect(of('a1')).toBe('<event.a1.r2.update@kestrel-ridge.example>');
    for (const id of ['KR 0417+31', 'a>\r\nBcc: x@y.example', '..', 'ν̇', 'x'.repeat(500), '-']) {
      // dot-atom "@" dot-atom of RFC 5322 §3.6.4
      expect(of(id)).toMatch(/^<[A-Za-z0-9-]+(\.[A-Za-z0-9-]+)*@kestrel-ridge\.example>$/);
    }
    expect(of('KR 0417+31')).not.toBe(of('KR 0417-31'));
    expect(of('a', 'no address')).toContain('@localhost.invalid>');
    expect(domainOf('Duty <duty@Kestrel-Ridge.example>')).toBe('kestrel-ridge.example');
    expect(namedMessageId('morning.2023-07-02', 'd@k.example')).toBe('<morning.2023-07-02@k.example>');
  });
});

describe('when to try again', () => {
  it('1 min doubling to 60 min, spread by a tenth, the same for the same attempt', () => {
    const minutes = (attempts: number, cause: Parameters<typeof pauseMs>[1] = 'later') =>
      pauseMs({ id: 'm1', attempts }, cause) / 60_000;
    for (const [attempts, nominal] of [
      [1, 1],
      [2, 2],
      [3, 4],
      [6, 32],
      [7, 60],
      [1000, 60],
    ] as const) {
      expect(Math.abs(minutes(attempts) / nominal - 1)).toBeLessThanOrEqual(0.1 + 1e-4);
      expect(minutes(attempts)).toBe(minutes(attempts));
    }
    expect(pauseMs({ id: 'm1', attempts: 3 }, 'later')).not.toBe(pauseMs({ id: 'm2', attempts: 3 }, 'later'));
    expect(minutes(1, 'login refused')).toBeGreaterThanOrEqual(54);
    expect(minutes(1, 'unknown')).toBeGreaterThanOrEqual(13.5);
  });

  it('five days, then no more', () => {
    const created = new Date('2023-07-01T00:00:00Z');
    expect(hasExpired(created, new Date('2023-07-05T23:59:59Z'))).toBe(false);
    expect(hasExpired(created, new Date('2023-07-06T00:00:00Z'))).toBe(true);
  });
});
