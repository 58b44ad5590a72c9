import { describe, expect, it } from 'vitest';
import { noisePrior } from '../../../detectors/filter/noisePrior.ts';
import { advance, detectorSettings, type PulsarReport, report, startWatch } from '../../../detectors/index.ts';
import { dice, observingDays } from '../../support/simulatedPulsar.ts';
import { modelOf, simulateTimedArrivals, spinUp } from '../../support/simulatedWatch.ts';

// Accreting pulsars spin up, and unsteadily (common practice, no source): arrivals of milliseconds, torque noise of turns a year,
// and a start model as wrong as a fit to such noise is.

const NU = 1.2407731918;
const MODEL = modelOf({ frequencyHz: String(NU), frequencyDerivativeHzPerS: 2.31e-12, epochMjd: 60_570 });
const GLITCH_DAY = 230;

function watched(seed: number, frequencyWalk: number, glitchSize = 0): PulsarReport {
  const random = dice(seed);
  const days = observingDays(150, 2, 0.4, random).map((day) => day + 30);
  const [rate, derivative] = [0.05 * random.normal(), 2e-3 * random.normal()];
  const glitch = spinUp(NU, GLITCH_DAY, glitchSize);
  const arrivals = simulateTimedArrivals(
    MODEL,
    {
      days,
      walks: { phaseWalk: 0, frequencyWalk, torqueWalk: 0 },
      uncertaintyUs: 3000,
      bandsMhz: [Number.POSITIVE_INFINITY],
      happening: (t, place) => rate * t + (derivative * t * t) / 2 + glitch(t, place),
    },
    random,
  );
  const watch = startWatch(MODEL, detectorSettings(1, 10));
  for (const arrival of arrivals) advance(watch, arrival);
  return report(watch);
}

const confirmed = (r: PulsarReport) => r.events.filter((e) => e.state === 'confirmed');

describe('an accreting pulsar', () => {
  it.each([
    [1e-5, 22],
    [6e-5, 43],
    [2e-4, 8],
  ])('is followed without an alert through a walk of %d (turns/day)²/day, seed %i', (walk, seed) => {
    const result = watched(seed, walk);
    expect(result.locked).toBe(true);
    expect(confirmed(result)).toEqual([]);
    expect(result.arrivals.every(({ fate }) => fate === 'used')).toBe(true);
    expect(Math.abs(Math.log(result.noise.frequencyWalk / walk))).toBeLessThan(Math.log(2));
  });

  it('shows its glitch all the same', () => {
    const events = confirmed(watched(15, 6e-5, -3e-6));
    expect(events.map(({ explanation }) => explanation)).toEqual(['spin-down glitch']);
    expect(Math.abs(events[0]!.epochMjd - (60_570 + GLITCH_DAY))).toBeLessThan(4);
    expect(Math.abs(events[0]!.deltaNuOverNu! / -3e-6 - 1)).toBeLessThan(0.2);
  });
});

describe('the noise expected of a pulsar that spins up', () => {
  it('is that of its accretion where this is the larger, and the law of spin-down else', () => {
    // Torque of its own size that is new each day: (ν̇ day)² after a day, as a rate in turns a day.
    const perDay = 2.31e-12 * 86_400 ** 2;
    expect(noisePrior(NU, 2.31e-12).frequencyWalk.median).toBeCloseTo(perDay ** 2, 12);
    expect(noisePrior(NU, -2.31e-12).frequencyWalk.median).toBeLessThan(perDay ** 2 / 100);
    expect(noisePrior(NU, 0)).toEqual(noisePrior(NU, -1e-18));
  });
});
