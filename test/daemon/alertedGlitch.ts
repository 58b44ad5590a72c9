import { simpleParser } from 'mailparser';
import type { TestStation } from '../support/station.ts';
import { syntheticArrivals, syntheticPulsar } from '../support/syntheticPulsar.ts';

/** A pulsar that glitches three weeks before its last arrival, and the mail that says so. */

const START = 61_000;
export const pulsar = syntheticPulsar({
  name: 'KR 0417+31',
  epochMjd: START,
  glitches: [{ mjd: START + 129, deltaNuOverNu: 2e-7 }],
});
const span = { fromMjd: START + 82, toMjd: START + 150, everyDays: 3, seed: 3 };
export const arrivals = syntheticArrivals(pulsar, span);
/** As they would be without the glitch. */
export const quietArrivals = syntheticArrivals({ ...pulsar, glitches: [] }, span);
/** The day of the last arrival. */
export const NOW = '2026-04-22T08:00:00.000Z';

/** The delivery loop's part, without a mail server: everything that waits leaves. */
export async function deliverAll({ store, station: { clock } }: TestStation) {
  const sent = [];
  for (;;) {
    const mail = store.claimDue('2030-01-01T00:00:00.000Z');
    if (mail === null) return sent;
    store.settle(mail.id, { kind: 'delivered', at: clock.now().toISOString() });
    sent.push({ mail, parsed: await simpleParser(Buffer.from(mail.content, 'latin1')) });
  }
}
