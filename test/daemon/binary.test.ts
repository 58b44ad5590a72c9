import { describe, expect, test } from 'vitest';
import { followPulsar } from '../../daemon/stages/deviation.ts';
import { PulsarWatches } from '../../daemon/stages/pulsarWatches.ts';
import { daysBetween, mjdNumber, parseMjd } from '../../detectors/time/mjd.ts';
import { stationForTest } from '../support/stationForTest.ts';
import { arrivalFile, orbitDelayS, syntheticArrivals, syntheticPulsar } from '../support/syntheticPulsar.ts';

const START = 61_000;
const binary = syntheticPulsar({
  name: 'KR 1844+06',
  epochMjd: START,
  uncertaintyUs: 20,
  glitches: [{ mjd: START + 100, deltaNuOverNu: 2e-7 }],
  orbit: { periodDays: 5.741, semiMajorAxisLightS: 12.6 },
});
const arrivals = syntheticArrivals(binary, { fromMjd: START + 1, toMjd: START + 150, everyDays: 3, seed: 8 });
/** Just after the last arrival: MJD 61151. */
const NOW = '2026-04-22T08:00:00.000Z';

describe('a pulsar in a binary', () => {
  test('is followed at its emission times, with the orbit on its bill, and its glitch is found', async () => {
    const at = await stationForTest({ pulsars: [binary], now: NOW });
    await at.deliver('binary.csv', arrivalFile(arrivals));

    const recorded = at.store.arrivals(binary.name);
    expect(recorded).toHaveLength(arrivals.length);
    const sent = new Map(arrivals.map((arrival) => [arrival.mjdText, arrival]));
    let [largest, widest] = [0, 0];
    for (const { timeText, tdb, delays } of recorded) {
      // On record is the time at the barycentre, before the orbit is removed.
      expect(daysBetween(tdb!, parseMjd(timeText)!)).toBe(0);
      const expected = orbitDelayS(binary, sent.get(timeText)!.seconds);
      largest = Math.max(largest, Math.abs(delays!.orbitS - expected));
      widest = Math.max(widest, Math.abs(expected));
    }
    expect(widest).toBeGreaterThan(10);
    // The digits of the file: 15 decimals of a day, and a double of seconds.
    expect(largest).toBeLessThan(1e-9);

    const [event, ...others] = at.store.events().map((listed) => listed.event);
    expect(others).toEqual([]);
    expect(event).toMatchObject({ pulsar: binary.name, explanation: 'glitch', state: 'confirmed' });
    expect(Math.abs(event!.epochMjd - (START + 100))).toBeLessThan(4);
    const [low, high] = event!.deltaNuOverNuInterval68!;
    expect(2e-7).toBeGreaterThan(low - (high - low));
    expect(2e-7).toBeLessThan(high + (high - low));

    // Before the glitch every deviation is the noise alone: 20 µs of 0.32 s.
    const nothingNew = { arrivals: [], statusChanges: [], retimed: [] };
    const verdicts = followPulsar(at.station, new PulsarWatches(), binary.name, nothingNew).arrivals;
    const before = new Set(recorded.filter(({ tdb }) => mjdNumber(tdb!) < START + 99).map((record) => record.key));
    const deviations = verdicts.filter(({ key }) => before.has(key)).map(({ deviationTurns }) => deviationTurns);
    expect(deviations.length).toBeGreaterThan(20);
    for (const turns of deviations) expect(Math.abs(turns)).toBeLessThan(5 * 20e-6 * binary.frequencyHz);
  });
});
