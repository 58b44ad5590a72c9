import type { PulsarTimes } from './pulsarTimes.ts';
import type { BelievedStep } from './siteClock.ts';
import { isAfter, isOfClock, placeNamed, type SiteStep } from './siteStep.ts';

/**
 * The steps that a pulsar is followed with: those of its clocks, before its last session. Sizes are rounded to within their
 * uncertainty, so that a session of another pulsar that moves the last digit does not send this one through its past again.
 */
export function knownSteps(steps: readonly BelievedStep[], { places, sessions }: PulsarTimes): SiteStep[] {
  return steps
    .filter((step) => sessions.some((s) => isOfClock(step, placeNamed(places[s.place]!)) && isAfter(step, s.siteMjd)))
    .map(({ site, receiver, afterMjd, beforeMjd, stepUs, uncertaintyUs }) => {
      const unit = 2 ** Math.floor(Math.log2(uncertaintyUs));
      const rounded = Math.round(stepUs / unit) * unit;
      return { site, receiver, afterMjd, beforeMjd, stepUs: rounded, uncertaintyUs: unit * ROUNDED_SIGMA };
    });
}

/** The uncertainty is at most two units; rounding adds half a unit. */
const ROUNDED_SIGMA = Math.hypot(2, 0.5);
