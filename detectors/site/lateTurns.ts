import type { PulsarTimes } from './pulsarTimes.ts';
import { isAfter, isOfClock, placeNamed, type SiteStep } from './siteStep.ts';

export interface Late {
  readonly times: PulsarTimes;
  readonly steps: readonly SiteStep[];
  readonly turns: Float64Array;
}

/** By how many turns the steps of its sites' clocks made each of a pulsar's sessions late. */
export function lateTurns({ places, frequencyHz, sessions }: PulsarTimes, steps: readonly SiteStep[]): Float64Array {
  const own = places.map((name) => steps.filter((step) => isOfClock(step, placeNamed(name))));
  const turnsPerUs = 1e-6 * frequencyHz;
  const turns = new Float64Array(sessions.length);
  sessions.forEach(({ place, siteMjd }, i) => {
    let late = 0;
    for (const step of own[place]!) if (isAfter(step, siteMjd)) late += step.stepUs;
    turns[i] = late * turnsPerUs;
  });
  return turns;
}
