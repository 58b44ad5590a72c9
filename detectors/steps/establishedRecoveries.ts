import type { CountedArrival } from '../filter/countedArrival.ts';
import type { GlitchFit } from '../recovery/glitchFit.ts';
import { measure } from './measure.ts';
import type { PulsarWatch } from './pulsarWatch.ts';

const SECONDS_PER_DAY = 86_400;

/** Takes established recoveries off: the free step of an event covers what stays, not what decays. */
export function withoutRecoveries(watch: PulsarWatch, counted: readonly CountedArrival[]): readonly CountedArrival[] {
  let left = counted;
  for (const track of watch.tracks) {
    if (track.state !== 'confirmed' || track.kind !== 'glitch') continue;
    const fit = measure(watch, track)?.glitch;
    if (fit) left = withoutRecovery(left, fit);
  }
  return left;
}

/** The same of one glitch. */
export function withoutRecovery(
  counted: readonly CountedArrival[],
  { bestEpochDays, recovery }: GlitchFit,
): readonly CountedArrival[] {
  const terms = recovery?.terms ?? [];
  return counted.map((arrival) => {
    const since = arrival.tDays - bestEpochDays;
    if (since <= 0) return arrival;
    let { deviationTurns } = arrival;
    for (const { timescaleDays, frequencyStepHz } of terms) {
      const timescale = timescaleDays.median;
      deviationTurns -= frequencyStepHz.mean * SECONDS_PER_DAY * timescale * Math.expm1(-since / timescale);
    }
    return { ...arrival, deviationTurns };
  });
}
