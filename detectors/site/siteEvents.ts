/** A step of a site's clock as an event: its own, in place of what it would have looked like in each of the pulsars. */

import type { Explanation, Interval, PulsarEvent } from '../steps/pulsarEvent.ts';
import type { BelievedStep } from './belief.ts';
import { CLOCK_STEPS_PER_YEAR } from './candidates.ts';

/** A clock that is back within so long was off for one night. */
const ONE_NIGHT_DAYS = 1.5;
const BACK_SIGMAS = 3;

/** @param steps in order of time. Epochs are those of the site's own clock. */
export function siteEvents(steps: readonly BelievedStep[]): PulsarEvent[] {
  const events: PulsarEvent[] = [];
  const back = new Set<BelievedStep>();
  for (const step of steps) {
    if (back.has(step)) continue;
    const undone = steps.find((other) => isUndone(step, other));
    if (undone !== undefined) back.add(undone);
    const event = siteEvent(step, undone === undefined ? 'clock step' : 'bad session');
    const same = events.filter(({ id }) => id === event.id || id.startsWith(`${event.id}.`)).length;
    events.push(same === 0 ? event : { ...event, id: `${event.id}.${same + 1}` });
  }
  return events;
}

function isUndone(step: BelievedStep, other: BelievedStep): boolean {
  const later = other.beforeMjd - step.beforeMjd;
  return (
    other.site === step.site &&
    other.receiver === step.receiver &&
    later > 0 &&
    later < ONE_NIGHT_DAYS &&
    Math.abs(other.stepUs + step.stepUs) < BACK_SIGMAS * Math.hypot(other.uncertaintyUs, step.uncertaintyUs)
  );
}

function siteEvent(step: BelievedStep, explanation: Explanation): PulsarEvent {
  const { stepUs, uncertaintyUs, interval95, logOdds, pulsars, shownAtMjd } = step;
  const site = step.receiver === null ? step.site : `${step.site}, ${step.receiver || 'receiver not named'}`;
  const interval: Interval = interval95;
  const epochMjd = (step.afterMjd + step.beforeMjd) / 2;
  const probability = 1 / (1 + Math.exp(-logOdds));
  return {
    id: `site-${site.replace(/[^A-Za-z0-9]+/g, '-')}-${Math.floor(step.beforeMjd)}`,
    pulsar: pulsars[0]!,
    state: 'confirmed',
    explanation,
    explanations: { [explanation]: probability, wandering: 1 - probability },
    epochMjd,
    epochInterval68: [step.afterMjd, step.beforeMjd],
    epochInterval95: interval,
    deltaNuHz: null,
    deltaNuHzInterval68: null,
    deltaNuHzInterval95: null,
    deltaNuOverNu: null,
    deltaNuOverNuInterval68: null,
    deltaNuDot: null,
    deltaNuDotInterval68: null,
    deltaNuDotOverNuDot: null,
    deltaNuDotOverNuDotInterval68: null,
    timeStepUs: stepUs,
    timeStepUsInterval68: [stepUs - uncertaintyUs, stepUs + uncertaintyUs],
    recovery: { terms: [], q: null },
    aliases: [],
    firstArrivalMjd: shownAtMjd[0]!,
    suspectedAtMjd: shownAtMjd[0]!,
    confirmedAtMjd: step.confirmedAtMjd,
    arrivalsUsed: shownAtMjd.length,
    logBayesFactor: step.logBayesFactor,
    falseAlertsPerYearAtThisLevel: CLOCK_STEPS_PER_YEAR * Math.exp(-logOdds),
    pulsars,
    site,
  };
}
