import type { CountedArrival } from '../filter/countedArrival.ts';
import { measure } from './measure.ts';
import type { PulsarWatch } from './pulsarWatch.ts';

const SECONDS_PER_DAY = 86_400;

/** Takes established recoveries off: the free step of an event covers what stays, not what decays. */
export function withoutRecoveries(watch: PulsarWatch, counted: CountedArrival[]): CountedArrival[] {
  let left = counted;
  for (const track of watch.tracks) {
    if (track.state !== 'confirmed' || track.kind !== 'glitch') continue;
    const fit = measure(watch, track)?.glitch;
    if (!fit?.recovery) continue;
    const { bestEpochDays } = fit;
    for (const term of fit.recovery.terms) {
      const timescale = term.timescaleDays.median;
      const turns = term.frequencyStepHz.mean * SECONDS_PER_DAY * timescale;
      left = left.map((a) => {
        const since = a.tDays - bestEpochDays;
        return since <= 0 ? a : { ...a, deviationTurns: a.deviationTurns - turns * Math.expm1(-since / timescale) };
      });
    }
  }
  return left;
}
