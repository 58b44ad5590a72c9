import { simpleParser } from 'mailparser';
import { describe, expect, test, vi } from 'vitest';
import { watchHealth } from '../../daemon/health.ts';
import { createSelfAlerts } from '../../daemon/schedule/selfAlerts.ts';
import { SiteClocks } from '../../detectors/index.ts';
import { stationForTest } from '../support/stationForTest.ts';
import { arrivalFile, type SyntheticArrival, syntheticArrivals, syntheticPulsar } from '../support/syntheticPulsar.ts';

// A fault in judging the clocks of the sites: pulsars are decided about, nothing known of the clocks is lost, and people are told.

const START = 61_000;
const STEP_DAY = 40;
const STEP_S = 2e-3;
const SECONDS_PER_DAY = 86_400;
const NOW = '2026-01-24T08:00:00.000Z';
const PULSARS = [2.317, 6.143, 1.717].map((frequencyHz, i) =>
  syntheticPulsar({ name: `KR 000${i}+00`, epochMjd: START, frequencyHz }),
);

const arrivalsOf = (fromDay: number, toDay: number) =>
  PULSARS.flatMap((pulsar, i) =>
    syntheticArrivals(pulsar, { fromMjd: START + fromDay, toMjd: START + toDay, everyDays: 2, seed: 20 + i }).map(late),
  );

/** As the clock of the site has it, which stepped. */
function late(arrival: SyntheticArrival): SyntheticArrival {
  const seconds = arrival.seconds + (arrival.seconds > STEP_DAY * SECONDS_PER_DAY ? STEP_S : 0);
  const day = Math.floor(seconds / SECONDS_PER_DAY);
  const fraction = (seconds - day * SECONDS_PER_DAY) / SECONDS_PER_DAY;
  return { ...arrival, seconds, mjdText: `${START + day}.${fraction.toFixed(15).slice(2)}` };
}

describe('clocks that cannot be judged', () => {
  test('hold up no pulsar and lose no step; health and the operators are told, until they are judged again', async () => {
    const at = await stationForTest({ pulsars: PULSARS, now: NOW });
    const health = () => watchHealth({ ...at.station, intake: null, delivery: null }).problems;
    const { run } = createSelfAlerts(at.station, { freeBytes: () => 50e9 });
    const siteEvents = () => at.store.events().flatMap(({ event }) => (event.site === null ? [] : [event]));
    await at.deliver('first.csv', arrivalFile(arrivalsOf(1, 52)));
    const known = siteEvents();
    expect(known.map(({ explanation, state }) => [explanation, state])).toEqual([['clock step', 'confirmed']]);
    expect(health()).toEqual([]);

    const judge = vi.spyOn(SiteClocks.prototype, 'steps').mockImplementation(() => {
      throw new Error('a planted fault');
    });
    await at.deliver('second.csv', arrivalFile(arrivalsOf(53, 60)));
    expect(judge).toHaveBeenCalled();
    for (const { name } of PULSARS) {
      const { lastArrivalMjd, siteSteps } = at.store.pulsarReport(name)!;
      expect(lastArrivalMjd).toBeGreaterThan(START + 53);
      expect(siteSteps).toHaveLength(1);
    }
    expect(siteEvents()).toEqual(known);
    expect(at.store.events().filter(({ event }) => event.explanation === 'glitch')).toEqual([]);
    expect(health().join()).toMatch(/clocks of the sites could not be judged/);
    expect(await run()).toBe(1);
    const mail = at.store.claimDue('2030-01-01T00:00:00.000Z')!;
    const { subject, text } = await simpleParser(Buffer.from(mail.content, 'latin1'));
    expect(subject).toMatch(/the clocks of the sites could not be judged/);
    expect(text).toMatch(/a planted fault/);

    judge.mockRestore();
    await at.deliver('third.csv', arrivalFile(arrivalsOf(61, 64)));
    expect(health()).toEqual([]);
    expect(siteEvents().map(({ id }) => id)).toEqual(known.map(({ id }) => id));
  });
});
