import { afterEach, describe, expect, test } from 'vitest';
import type { Delivery, DeliveryOutcome } from '../../alerts/index.ts';
import { silentLog } from '../../daemon/log.ts';
import { type DeliveryLoop, startDelivery } from '../../daemon/schedule/deliver.ts';
import { createTestStation, type TestStation } from '../support/station.ts';
import { syntheticPulsar } from '../support/syntheticPulsar.ts';
import { within } from '../support/within.ts';

const NOW = '2026-06-01T08:00:00.000Z';
const open: (() => Promise<void>)[] = [];
afterEach(async () => {
  for (const close of open.splice(0).reverse()) await close();
});

interface Rig {
  readonly at: TestStation;
  readonly loop: DeliveryLoop;
  readonly sent: Delivery[];
  readonly givenUp: string[];
  readonly fatal: unknown[];
  queue(name: string, recipients: readonly string[], body?: string): void;
  states(): string[];
}

/** The loop over a real record, with a mail server that answers as the test says. */
async function rig(
  answer: (delivery: Delivery, nth: number) => Promise<DeliveryOutcome> | DeliveryOutcome,
): Promise<Rig> {
  const at = await createTestStation({ pulsars: [syntheticPulsar({ name: 'KR 1', epochMjd: 61_000 })], now: NOW });
  const sent: Delivery[] = [];
  const givenUp: string[] = [];
  const fatal: unknown[] = [];
  const loop = startDelivery({
    store: at.store,
    clock: at.station.clock,
    log: silentLog(),
    from: 'spinvigil@kestrel-ridge.example',
    mailer: {
      send: async (delivery) => answer(delivery, sent.push(delivery)),
      verify: async () => ({ state: 'delivered', detail: '' }),
    },
    onGivenUp: async (mail, state, why) => void givenUp.push(`${mail.recipient} ${state}: ${why}`),
    onFatal: (error) => fatal.push(error),
  });
  open.push(at.close, () => loop.stop(100));
  return {
    at,
    loop,
    sent,
    givenUp,
    fatal,
    queue(name, recipients, body = 'x\r\n') {
      const content = `Message-ID: <${name}>\r\nSubject: ${name}\r\n\r\n${body}`;
      const message = {
        messageId: `<${name}>`,
        kind: 'notice',
        eventId: null,
        subject: name,
        inReplyTo: null,
      } as const;
      at.store.commitNotice({ ...message, recipients, content, dueAt: NOW }, NOW);
      loop.wake();
    },
    states: () => at.store.outbox().map(({ recipient, state }) => `${recipient} ${state}`),
  };
}

const delivered = { state: 'delivered', detail: '250' } as const;

describe('the delivery loop', () => {
  test('sends what is queued as soon as it is woken', async () => {
    const { queue, states, sent } = await rig(() => delivered);
    queue('first', ['a@x.example', 'b@x.example']);
    expect(await within(10, () => sent.length === 2)).toBe(true);
    expect(await within(10, () => states().every((state) => state.endsWith('delivered')))).toBe(true);
  });

  test('D1, D7: one recipient in trouble holds up no other', async () => {
    const { queue, states, at } = await rig(({ recipient }) =>
      recipient.startsWith('a') ? { state: 'later', detail: '451 try later' } : delivered,
    );
    queue('first', ['a@x.example', 'b@x.example']);
    queue('second', ['b@x.example']);
    expect(await within(10, () => states().filter((state) => state.endsWith('delivered')).length === 2)).toBe(true);
    const [waiting] = at.store.outbox({ state: 'queued' });
    expect(waiting).toMatchObject({ recipient: 'a@x.example', attempts: 1, lastError: '451 try later' });
    expect(Date.parse(waiting!.dueAt) - Date.parse(NOW)).toBeGreaterThan(50_000);
  });

  test('D4: a server that greylists gets the same mail again from the same sender, and takes it', async () => {
    const { at, loop, queue, states, sent } = await rig((_, nth) =>
      nth < 3 ? { state: 'later', detail: '451 greylisted' } : delivered,
    );
    queue('first', ['a@x.example']);
    for (const [tries, now] of [
      [1, '2026-06-01T09:00:00.000Z'],
      [2, '2026-06-01T10:00:00.000Z'],
    ] as const) {
      expect(await within(10, () => sent.length === tries && states()[0] === 'a@x.example queued')).toBe(true);
      at.setNow(now);
      loop.wake();
    }
    expect(await within(10, () => states()[0] === 'a@x.example delivered')).toBe(true);
    for (const again of sent) expect(again).toEqual(sent[0]);
  });

  test('D3: a refusal is final, and told', async () => {
    const { queue, givenUp, sent } = await rig(() => ({ state: 'refused', detail: '550 unknown' }));
    queue('first', ['a@x.example']);
    expect(await within(10, () => givenUp.length === 1)).toBe(true);
    expect(givenUp).toEqual(['a@x.example refused: 550 unknown']);
    expect(sent).toHaveLength(1);
  });

  test('D9: an answer that never came leads to one more copy, marked', async () => {
    const { queue, at, sent, loop } = await rig((_, nth) =>
      nth === 1 ? { state: 'unknown', detail: 'no answer' } : delivered,
    );
    queue('first', ['a@x.example']);
    expect(await within(10, () => at.store.outbox()[0]?.possibleDuplicate === true)).toBe(true);
    at.setNow('2026-06-01T09:00:00.000Z');
    loop.wake();
    expect(await within(10, () => sent.length === 2)).toBe(true);
    expect(sent.map(({ mime }) => mime.toString().includes('[possible duplicate]'))).toEqual([false, true]);
  });

  test('D11 a message that is too large goes without its picture, and the record says so', async () => {
    const { queue, at, sent, givenUp } = await rig(({ mime }) =>
      mime.includes('image/png') ? { state: 'refused', detail: '552 too large', tooLarge: true } : delivered,
    );
    const picture = '--b\r\nContent-Type: image/png\r\n\r\nQUJD\r\n--b--\r\n';
    queue('first', ['a@x.example'], `\r\n--b\r\nContent-Type: text/html\r\n\r\nhello\r\n${picture}`);
    expect(await within(10, () => at.store.outbox()[0]?.state === 'delivered')).toBe(true);
    expect(at.store.outbox()[0]).toMatchObject({
      attempts: 1,
      lastError: 'too large with its picture (552 too large); sent without',
    });
    expect(sent.map(({ mime }) => mime.includes('QUJD'))).toEqual([true, false]);
    expect(sent[1]!.mime.toString()).toContain('hello');
    expect(givenUp).toEqual([]);
  });

  test('D11 a message that is too large without a picture too is refused', async () => {
    const { queue, sent, givenUp } = await rig(() => ({ state: 'refused', detail: '552 too large', tooLarge: true }));
    queue('first', ['a@x.example']);
    expect(await within(10, () => givenUp.length === 1)).toBe(true);
    expect(sent).toHaveLength(1);
    expect(givenUp).toEqual(['a@x.example refused: 552 too large']);
  });

  test('D10: a refused login stops the attempts of everybody, so that the account is not locked', async () => {
    const { queue, sent, loop, states } = await rig(() => ({ state: 'later', detail: '535', loginRefused: true }));
    queue('first', ['a@x.example', 'b@x.example', 'c@x.example']);
    expect(await within(10, () => sent.length === 1)).toBe(true);
    loop.wake();
    await within(0.3, () => sent.length > 1);
    expect(sent).toHaveLength(1);
    expect(states().filter((state) => state.endsWith('queued'))).toHaveLength(3);
    expect(loop.trouble()).toBe('535');
  });

  test('mail is given up after five days, and that is told', async () => {
    const { queue, at, givenUp, loop } = await rig(() => ({ state: 'later', detail: 'connection refused' }));
    queue('first', ['a@x.example']);
    expect(await within(10, () => at.store.outbox()[0]?.attempts === 1)).toBe(true);
    at.setNow('2026-06-06T08:00:01.000Z');
    loop.wake();
    expect(await within(10, () => givenUp.length === 1)).toBe(true);
    expect(at.store.outbox()[0]).toMatchObject({ state: 'expired' });
  });

  test('B6: no mail is given up because somebody set the wall clock', async () => {
    const { queue, at, givenUp, sent, loop } = await rig(() => ({ state: 'later', detail: 'connection refused' }));
    queue('first', ['a@x.example']);
    expect(await within(10, () => at.store.outbox()[0]?.attempts === 1)).toBe(true);
    at.setWallClock('2027-06-06T08:00:00.000Z');
    loop.wake();
    expect(await within(10, () => sent.length === 2)).toBe(true);
    expect(givenUp).toEqual([]);
  });

  test('a mailer that throws loses nothing', async () => {
    const { queue, at, fatal } = await rig(() => {
      throw new Error('surprise');
    });
    queue('first', ['a@x.example']);
    expect(await within(10, () => at.store.outbox()[0]?.lastError === 'surprise')).toBe(true);
    expect(at.store.outbox()[0]).toMatchObject({ state: 'queued' });
    expect(fatal).toEqual([]);
  });

  test('stopping leaves a message that hangs marked as attempted', async () => {
    const { queue, loop, sent, at } = await rig(() => new Promise(() => {}));
    queue('first', ['a@x.example']);
    expect(await within(10, () => sent.length === 1)).toBe(true);
    await loop.stop(50);
    expect(at.store.outbox()[0]).toMatchObject({ state: 'attempting' });
  });
});
