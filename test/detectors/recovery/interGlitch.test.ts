import { describe, expect, it } from 'vitest';
import { secondDerivative } from '../../../detectors/recovery/interGlitch.ts';
import { dice, observingDays, simulateArrivals } from '../../support/simulatedPulsar.ts';

describe('the braking index between glitches', () => {
  it('is that of the simulated ν̈, within its interval', () => {
    // n = ν ν̈/ν̇² = 20 of a pulsar like Vela (ν, ν̇ from memory): a third-power term of the phase.
    const nu = 11.19;
    const nuDot = -1.56e-11;
    const second = (20 * nuDot ** 2) / nu;
    const random = dice(81);
    const days = observingDays(200, 5, 0.5, random);
    const walks = { phaseWalk: 0, frequencyWalk: 1e-13, torqueWalk: 0 };
    const arrivals = simulateArrivals(days, walks, 1e-3, random).map((a) => ({
      ...a,
      deviationTurns: a.deviationTurns - (second * (a.tDays * 86_400) ** 3) / 6,
    }));
    const found = secondDerivative(arrivals, { ...walks, uncertaintyScale: 1, floorTurns: 0 }, [])!;
    expect(Math.abs(found.mean - second)).toBeLessThan(2 * found.sd);
    expect(found.sd).toBeLessThan(0.2 * second);
    const quiet = simulateArrivals(days, walks, 1e-3, random);
    const none = secondDerivative(quiet, { ...walks, uncertaintyScale: 1, floorTurns: 0 }, [30])!;
    expect(Math.abs(none.mean)).toBeLessThan(3 * none.sd);
  });

  it('is not asked of a handful of arrivals', () => {
    const few = simulateArrivals([0, 5, 9], { phaseWalk: 0, frequencyWalk: 0, torqueWalk: 0 }, 1e-3, dice(82));
    const noise = { phaseWalk: 0, frequencyWalk: 0, torqueWalk: 0, uncertaintyScale: 1, floorTurns: 0 };
    expect(secondDerivative(few, noise, [])).toBeNull();
  });
});
