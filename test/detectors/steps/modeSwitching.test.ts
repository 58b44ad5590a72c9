// Pulsars that switch between two spin-down rates every few months to years: Lyne et al. 2010, Science 329, 408 (sizes of a few to
// some tens of per cent, from memory).
import { describe, expect, it } from 'vitest';
import { dice, observingDays } from '../../support/simulatedPulsar.ts';
import { type Happening, modelOf } from '../../support/simulatedWatch.ts';
import { confirmed, probabilitySum, watched } from '../../support/watched.ts';

const NU = 3.3;
const SECONDS_PER_DAY = 86_400;

function model(frequencyDerivativeHzPerS: number) {
  return modelOf({ frequencyHz: String(NU), frequencyDerivativeHzPerS, epochMjd: 58_000 });
}

/** ν̇ changes by Δν̇ at each of the days, there and back. */
function switching(days: readonly number[], stepHzPerS: number): Happening {
  const stepTurns = stepHzPerS * SECONDS_PER_DAY ** 2;
  return (t) =>
    days.reduce((sum, day, i) => sum + ((i % 2 === 0 ? 1 : -1) * stepTurns * Math.max(0, t - day) ** 2) / 2, 0);
}

describe('a pulsar that switches between two spin-down rates', () => {
  it.each([[7, -9.7e-14, 0.18, 440, [330, 560, 1030]]])(
    'is one event with that name (seed %i, ν̇ = %f, Δν̇/ν̇ = %f)',
    (seed, nuDot, part, uncertaintyUs, switches) => {
      const days = observingDays(165, 7, 0.6, dice(seed));
      const walks = { phaseWalk: 0, frequencyWalk: 1e-14, torqueWalk: 0 };
      const happening = switching(switches, part * Math.abs(nuDot));
      const events = confirmed(watched(model(nuDot), seed, { days, walks, uncertaintyUs, happening }));
      expect(events.map((e) => e.explanation)).toEqual(['mode switching']);
      const [event] = events;
      expect(Math.abs(event!.deltaNuDotOverNuDot!) / part).toBeCloseTo(1, 1);
      expect(Math.abs(event!.epochMjd - 58_000 - switches[0]!)).toBeLessThan(10);
      expect(event!.explanations['mode switching']!).toBeGreaterThan(0.9);
      expect(probabilitySum(event!)).toBeCloseTo(1, 9);
    },
  );

  it.each([1, 2, 3])('is not what torque noise is called, seed %i', (seed) => {
    const days = observingDays(120, 7, 0.6, dice(seed));
    // A walk in torque by a twentieth of ν̇ in 300 days.
    const torqueWalk = (0.05 * 1e-13 * SECONDS_PER_DAY ** 2) ** 2 / 300;
    const walks = { phaseWalk: 0, frequencyWalk: 1e-14, torqueWalk };
    const { events } = watched(model(-1e-13), seed, { days, walks, uncertaintyUs: 150 });
    expect(events.map((e) => e.explanation)).not.toContain('mode switching');
  });
});
