import type { BelievedStep } from './belief.ts';
import type { PulsarTimes } from './pulsarTimes.ts';
import { isAfter, isOfClock, placeNamed, type SiteStep } from './siteStep.ts';

/** What a rounded step may be wrong by in a pulsar, as a share of the error of one of its sessions. */
const HARMLESS_SHARE = 0.1;
/** The uncertainty is at most two units; rounding adds half a unit. */
const ROUNDED_SIGMA = Math.hypot(2, 0.5);

/**
 * The steps that a pulsar is followed with: those of its clocks, before its last session. Sizes are rounded, to within their
 * uncertainty or to what the pulsar cannot tell, so that a session of another pulsar that moves a step a little does not send this one
 * through its past again.
 */
export function knownSteps(steps: readonly BelievedStep[], times: PulsarTimes): SiteStep[] {
  const lastMjd = times.places.map(() => -Infinity);
  for (const { place, siteMjd } of times.sessions) lastMjd[place] = Math.max(lastMjd[place]!, siteMjd);
  const harmless = 2 * HARMLESS_SHARE * typicalErrorUs(times);
  return steps
    .filter((step) => times.places.some((name, i) => isOfClock(step, placeNamed(name)) && isAfter(step, lastMjd[i]!)))
    .map(({ site, receiver, afterMjd, beforeMjd, stepUs, uncertaintyUs }) => {
      const unit = powerOfTwoBelow(Math.max(uncertaintyUs, harmless));
      const rounded = Math.round(stepUs / unit) * unit;
      return { site, receiver, afterMjd, beforeMjd, stepUs: rounded, uncertaintyUs: unit * ROUNDED_SIGMA };
    });
}

/** The median, of the sessions. */
function typicalErrorUs({ sessions, frequencyHz }: PulsarTimes): number {
  const variances = sessions.map(({ varianceTurns2 }) => varianceTurns2).sort((a, b) => a - b);
  return (1e6 * Math.sqrt(variances[variances.length >> 1] ?? 0)) / frequencyHz;
}

function powerOfTwoBelow(x: number): number {
  return 2 ** Math.floor(Math.log2(x));
}
