import { uniformFloat64 } from 'pure-rand/distribution/uniformFloat64';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import type { CountedArrival } from '../../detectors/filter/countedArrival.ts';
import type { Walks } from '../../detectors/filter/stateSpace.ts';

/** Seeded random numbers for simulations in tests. */
export interface Dice {
  uniform(): number;
  normal(): number;
}

export function dice(seed: number): Dice {
  const generator = xoroshiro128plus(seed);
  const uniform = (): number => uniformFloat64(generator);
  // Box and Muller 1958; 1 − u keeps the logarithm finite.
  const normal = (): number => Math.sqrt(-2 * Math.log(1 - uniform())) * Math.cos(2 * Math.PI * uniform());
  return { uniform, normal };
}

/**
 * Random walks in phase, frequency and torque sampled at the given days, turns. Independent of the code under test: the
 * exact joint increments are built from integrals of white noise (means and covariances of ∫dW, ∫s dW, ∫s² dW).
 */
export function simulateWalk(days: readonly number[], walks: Walks, { normal }: Dice): number[] {
  let phase = 0;
  let rate = 0;
  let second = 0;
  return days.map((day, i) => {
    const t = i === 0 ? 0 : day - days[i - 1]!;
    if (t > 0) {
      phase += rate * t + 0.5 * second * t * t;
      rate += second * t;
      phase += Math.sqrt(walks.phaseWalk * t) * normal();
      const f = Math.sqrt(walks.frequencyWalk);
      const f1 = normal();
      const f2 = normal();
      phase += f * t ** 1.5 * (f1 / 2 + f2 / Math.sqrt(12));
      rate += f * Math.sqrt(t) * f1;
      const g = Math.sqrt(walks.torqueWalk);
      const g1 = normal();
      const g2 = normal();
      const g3 = normal();
      phase += g * t ** 2.5 * (g1 / 6 + g2 / (4 * Math.sqrt(3)) + g3 / (12 * Math.sqrt(5)));
      rate += g * t ** 1.5 * (g1 / 2 + g2 / Math.sqrt(12));
      second += g * Math.sqrt(t) * g1;
    }
    return phase;
  });
}

/** Days of arrivals at a mean cadence, each jittered by up to `jitter` of it. */
export function observingDays(count: number, cadenceDays: number, jitter: number, { uniform }: Dice): number[] {
  return Array.from({ length: count }, (_, i) => cadenceDays * (i + jitter * (uniform() - 0.5)));
}

/** One receiver, one band. */
export function simulateArrivals(
  days: readonly number[],
  walks: Walks,
  sigmaTurns: number,
  random: Dice,
): CountedArrival[] {
  const walk = simulateWalk(days, walks, random);
  return days.map((tDays, i) => ({
    tDays,
    deviationTurns: walk[i]! + sigmaTurns * random.normal(),
    sigmaTurns,
    frequencyMhz: 1400,
    group: 0,
    used: true,
  }));
}
