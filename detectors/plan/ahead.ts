/** The pulsar carried ahead of its last arrival: how well the phase is predicted, and by what the next arrival measures it. */

import { arrivalVariance } from '../filter/stateSpace.ts';
import { median } from '../math/median.ts';
import { copyOf, gapOf, type Hypothesis, propagate } from '../steps/hypothesis.ts';
import type { PulsarWatch } from '../steps/pulsarWatch.ts';
import { mjdNumber } from '../time/mjd.ts';

const RECENT_ARRIVALS = 30;

export function lastMjd({ line }: PulsarWatch): number {
  return mjdNumber(line.seen.at(-1)!.arrival.tdb);
}

/** The heaviest hypothesis without a new event, so many days after the last arrival. */
export function nullAhead(watch: PulsarWatch, days: number): Hypothesis {
  const ahead = copyOf(watch.bank!.beam[0]!);
  propagate(ahead, gapOf(days, watch.noise, watch.states.decays));
  return ahead;
}

/** Variance of an arrival as good as they usually are, turns². */
export function usualVariance(watch: PulsarWatch): number {
  const sigmaTurns = median(watch.line.seen.slice(-RECENT_ARRIVALS).map((seen) => seen.sigmaTurns));
  return arrivalVariance(sigmaTurns, watch.noise);
}

/** Days; IERS Conventions 2010, from the Earth rotation rate at present epochs. */
export const SIDEREAL_DAY = 86_164.0905 / 86_400;

/** The first time from `fromMjd` on at which the pulsar stands as it usually does when it is observed (same sidereal time). */
export function nextUsualTime(watch: PulsarWatch, fromMjd: number): number {
  let east = 0;
  let north = 0;
  for (const { arrival } of watch.line.seen.slice(-RECENT_ARRIVALS)) {
    const angle = (2 * Math.PI * mjdNumber(arrival.tdb)) / SIDEREAL_DAY;
    east += Math.cos(angle);
    north += Math.sin(angle);
  }
  const usual = (Math.atan2(north, east) / (2 * Math.PI)) * SIDEREAL_DAY;
  return usual + SIDEREAL_DAY * Math.ceil((fromMjd - usual) / SIDEREAL_DAY);
}
