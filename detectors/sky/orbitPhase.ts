import type { OrbitSize } from '../spin/orbitModel.ts';
import { type Mjd, SECONDS_PER_DAY } from '../time/mjd.ts';

/** How far along its orbit a pulsar is. */
export interface OrbitPhase {
  /** Whole orbits since the epoch, to the nearest. */
  readonly whole: number;
  /** The rest, 2π an orbit, in about [−π, π]. */
  readonly angleRad: number;
  readonly secondsSinceEpoch: number;
}

/**
 * Orbits since the epoch, τ/P − ½ Ṗ (τ/P)², with the whole ones taken out before anything is rounded: the remainder of whole days by the
 * period is exact, so that no digit of the time is lost over thousands of orbits.
 */
export function orbitPhase(orbit: OrbitSize, epoch: Mjd, at: Mjd): OrbitPhase {
  const wholeDays = at.day - epoch.day;
  const restDays = at.fraction - epoch.fraction;
  const remainder = wholeDays % orbit.periodDays;
  const before = Math.round((wholeDays - remainder) / orbit.periodDays);
  const elapsed = (wholeDays + restDays) / orbit.periodDays;
  const orbits = (remainder + restDays) / orbit.periodDays - 0.5 * orbit.periodDerivative * elapsed * elapsed;
  const nearest = Math.round(orbits);
  return {
    whole: before + nearest,
    angleRad: 2 * Math.PI * (orbits - nearest),
    secondsSinceEpoch: (wholeDays + restDays) * SECONDS_PER_DAY,
  };
}
