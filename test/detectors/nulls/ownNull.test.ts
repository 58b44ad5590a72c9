import { describe, expect, it } from 'vitest';
import { advance, detectorSettings, startWatch } from '../../../detectors/index.ts';
import { levelFor, nullTail, rateAt } from '../../../detectors/nulls/nullTail.ts';
import { falseAlertsPerYearAt, requiredLogOdds } from '../../../detectors/nulls/ownNull.ts';
import { TOTAL_RATE } from '../../../detectors/steps/threshold.ts';
import { dice, observingDays } from '../../support/simulatedPulsar.ts';
import { modelOf, simulateTimedArrivals } from '../../support/simulatedWatch.ts';

const DEMANDS = { leastJointOdds: Number.POSITIVE_INFINITY, sessions: 2 };
const MODEL = modelOf({ frequencyHz: '3.123456789', frequencyDerivativeHzPerS: -2e-14, epochMjd: 60_000 });

function quietWatch(pulsars: number) {
  const random = dice(5);
  const walks = { phaseWalk: 0, frequencyWalk: 1e-14, torqueWalk: 0 };
  const days = observingDays(40, 7, 0.6, random);
  const watch = startWatch(MODEL, detectorSettings(1, pulsars));
  for (const arrival of simulateTimedArrivals(MODEL, { days, walks, uncertaintyUs: 60 }, random))
    advance(watch, arrival);
  return watch;
}

describe('an exponential tail', () => {
  const rate = (level: number) => 0.02 * Math.exp(-1.5 * level);
  const levels = [3, 4, 5];
  const tail = { levels, perYear: levels.map(rate) };

  it('is read between its levels as it was laid', () => {
    for (const level of [3, 3.7, 4.2, 5]) {
      expect(rateAt(tail, level)).toBeCloseTo(rate(level), 12);
      expect(levelFor(tail, rate(level))).toBeCloseTo(level, 9);
    }
  });

  it('goes on with slope 1 beyond them', () => {
    expect(rateAt(tail, 8)).toBeCloseTo(rate(5) * Math.exp(-3), 14);
    expect(levelFor(tail, rate(5) / 100)).toBeCloseTo(5 + Math.log(100), 9);
  });

  it('asks for no more than its lowest level where even that is rare enough', () => {
    expect(levelFor(tail, 1)).toBe(3);
    expect(levelFor({ levels, perYear: [0, 0, 0] }, 1e-9)).toBe(3);
  });
});

describe("a pulsar's own null", () => {
  it("keeps Ville's bound, and comes out the same twice", () => {
    const watch = quietWatch(100);
    const tail = nullTail(watch, DEMANDS, 40);
    tail.perYear.forEach((perYear, k) => {
      // Both weighings ask for the level, so that no crossing counts for more than λ e^(−level), but for the sampling.
      expect(perYear).toBeLessThan(2 * TOTAL_RATE * Math.exp(-tail.levels[k]!));
    });
    expect(tail.perYear[0]).toBeGreaterThan(0);
    expect(nullTail(watch, DEMANDS, 40)).toEqual(tail);
  });

  it('is not simulated where the budget is kept ten times over', () => {
    const watch = quietWatch(100);
    expect(requiredLogOdds(watch, 6.5, DEMANDS)).toBe(watch.settings.confirmLogOdds);
    expect(watch.ownNull).toBeNull();
    expect(falseAlertsPerYearAt(watch, 6.5)).toBeCloseTo(100 * TOTAL_RATE * Math.exp(-6.5), 12);
  });

  it('is simulated once for a large programme, and then states the rate of an event', () => {
    const watch = quietWatch(1_000_000);
    const required = requiredLogOdds(watch, 9, DEMANDS);
    expect(required).toBeGreaterThan(watch.settings.confirmLogOdds);
    const { ownNull } = watch;
    expect(ownNull).not.toBeNull();
    expect(requiredLogOdds(watch, 9, DEMANDS)).toBe(required);
    expect(watch.ownNull).toBe(ownNull);
    // At the odds that it asks for the whole programme spends its budget of one a year.
    expect(falseAlertsPerYearAt(watch, required)).toBeCloseTo(1, 6);
    watch.noise = { ...watch.noise };
    requiredLogOdds(watch, 9, DEMANDS);
    expect(watch.ownNull).not.toBe(ownNull);
  });
});
