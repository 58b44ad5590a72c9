import { asyncProperty, assert as checkProperty, shuffledSubarray } from 'fast-check';
import { simpleParser } from 'mailparser';
import { describe, expect, test } from 'vitest';
import type { TestStation } from '../support/station.ts';
import { stationForTest } from '../support/stationForTest.ts';
import { arrivalFile, type SyntheticArrival, syntheticArrivals, syntheticPulsar } from '../support/syntheticPulsar.ts';

/** Three pulsars of one site whose clock steps in the night in which one of them truly glitches. */
const START = 61_000;
const EVENT_DAY = 60;
const STEP_S = 400e-6;
const SECONDS_PER_DAY = 86_400;
const glitching = syntheticPulsar({
  name: 'KR 0417+31',
  epochMjd: START,
  glitches: [{ mjd: START + EVENT_DAY, deltaNuOverNu: 3e-7 }],
});
const others = [
  syntheticPulsar({ name: 'KR 1021-05', epochMjd: START, frequencyHz: 6.143 }),
  syntheticPulsar({ name: 'KR 2210+17', epochMjd: START, frequencyHz: 1.717 }),
];
const PULSARS = [glitching, ...others];
const span = { fromMjd: START + 1, toMjd: START + 75, everyDays: 2 };
const ARRIVALS = PULSARS.flatMap((pulsar, i) => syntheticArrivals(pulsar, { ...span, seed: 20 + i }).map(late));
/** Just after the last arrival: MJD 61076. */
const NOW = '2026-02-05T08:00:00.000Z';
const LATER = '2026-02-06T08:00:00.000Z';

function late(arrival: SyntheticArrival): SyntheticArrival {
  const seconds = arrival.seconds + (arrival.seconds > EVENT_DAY * SECONDS_PER_DAY ? STEP_S : 0);
  const day = Math.floor(seconds / SECONDS_PER_DAY);
  const fraction = (seconds - day * SECONDS_PER_DAY) / SECONDS_PER_DAY;
  return { ...arrival, seconds, mjdText: `${START + day}.${fraction.toFixed(15).slice(2)}` };
}

function station(): Promise<TestStation> {
  return stationForTest({ pulsars: PULSARS, now: NOW });
}

const eventsOf = ({ store }: TestStation) => store.events().map(({ event }) => event);

describe('a step of the clock of a site with three pulsars, of which one glitches that night', () => {
  test('is one event of the site, and the glitch one of its pulsar', async () => {
    const at = await station();
    await at.deliver('all.csv', arrivalFile(ARRIVALS), { mail: true });
    const events = eventsOf(at).filter(({ state }) => state === 'confirmed');
    const [step, ...more] = events.filter(({ site }) => site !== null);
    expect(more).toEqual([]);
    expect(step!.explanation).toBe('clock step');
    expect(Math.abs(step!.epochMjd - (START + EVENT_DAY))).toBeLessThan(2);
    expect(Math.abs(step!.timeStepUs! - STEP_S * 1e6)).toBeLessThan(100);
    for (const { name } of others) expect(step!.pulsars).toContain(name);
    const own = events.filter(({ site }) => site === null);
    expect(own.map(({ pulsar, explanation }) => [pulsar, explanation])).toEqual([['KR 0417+31', 'glitch']]);
  });

  test('is one mail that names the pulsars; those it explains are not mailed about', async () => {
    const at = await station();
    await at.deliver('all.csv', arrivalFile(ARRIVALS), { mail: true });
    const step = eventsOf(at).find(({ site }) => site !== null)!;
    const mails = at.store.outbox({ kind: 'event' });
    expect(new Set(mails.filter(({ eventId }) => eventId === step.id).map(({ messageId }) => messageId)).size).toBe(1);
    const texts: string[] = [];
    for (let mail = at.store.claimDue(LATER); mail !== null; mail = at.store.claimDue(LATER))
      if (mail.eventId === step.id) texts.push((await simpleParser(Buffer.from(mail.content, 'latin1'))).text!);
    expect(texts).toHaveLength(1);
    for (const { name } of others) expect(texts[0]).toContain(name);
    const told = new Set(mails.map(({ eventId }) => at.store.event(eventId!)!.event));
    expect([...told].filter(({ site }) => site === null).map(({ pulsar }) => pulsar)).toEqual(['KR 0417+31']);
  });

  test('is the same whatever the order of the files', async () => {
    const reference = await station();
    await reference.deliver('all.csv', arrivalFile(ARRIVALS));
    const files = [0, 1, 2, 3].map((part) => ARRIVALS.filter((_, i) => (7 * i) % 4 === part));
    await checkProperty(
      asyncProperty(shuffledSubarray([0, 1, 2, 3], { minLength: 4 }), async (order) => {
        const at = await station();
        for (const part of order) await at.deliver(`part-${part}.csv`, arrivalFile(files[part]!));
        expect(eventsOf(at)).toEqual(eventsOf(reference));
        expect(at.store.pulsarTimes()).toEqual(reference.store.pulsarTimes());
      }),
      { seed: 5, numRuns: 2 },
    );
  }, 240_000);
});
