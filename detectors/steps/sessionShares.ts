/** How sure it is that a session of which no arrival was used is bad as a whole. */

import { logSumExp } from '../math/logSumExp.ts';
import { logGoodOverOutlier, OUTLIER_SHARE, OUTLIER_SHARE_AFTER_OUTLIER } from './beam.ts';
import { bestOf, countedArrivals } from './counts.ts';
import { absorb, copyOf, type Hypothesis, predict } from './hypothesis.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { decisionsOf, retrace } from './retrace.ts';
import { foundStartRate, startBeam } from './start.ts';
import { observationOf } from './timeline.ts';

/** Arrivals (index) of a session. */
export interface SessionSpan {
  readonly first: number;
  readonly last: number;
}

export interface SessionShares {
  /** Probability of: the session is bad, each of its arrivals is bad by itself, all are good and the pulsar wanders. */
  readonly explanations: Readonly<Record<string, number>>;
  /** Natural log of the likelihood of a bad session against good arrivals. */
  readonly logBayesFactor: number;
}

/** By the arrivals before each session; one pass through the record for all of them. */
export function sessionShares(watch: PulsarWatch, sessions: readonly SessionSpan[]): SessionShares[] {
  if (sessions.length === 0) return [];
  const best = bestOf(watch);
  const decisions = decisionsOf(best);
  const belief = { noise: watch.noise, tracks: watch.tracks.filter((t) => t.state === 'confirmed') };
  const beam = startBeam(watch, foundStartRate(countedArrivals(watch, best)));
  const shares: SessionShares[] = [];
  let i = 1;
  for (const session of sessions) {
    for (; i <= session.first; i++) for (const h of beam) retrace(watch, h, decisions[i]!, belief);
    const heaviest = beam.reduce((a, b) => (b.logWeight > a.logWeight ? b : a));
    shares.push(sharesOf(watch, heaviest, session));
  }
  return shares;
}

/** `before`: as the session's first arrival was predicted. */
function sharesOf(watch: PulsarWatch, before: Hypothesis, { first, last }: SessionSpan): SessionShares {
  const { scratch } = watch.bank!;
  const h = copyOf(before);
  let goodOverOutlier = 0;
  for (let i = first; i <= last; i++) {
    const seen = observationOf(watch.line, i, watch.states, watch.noise);
    predict(h, seen.sight, scratch);
    const offset = seen.deviation - scratch.deviation;
    const innovation = offset - Math.round(offset);
    const variance = scratch.variance + seen.variance;
    goodOverOutlier += logGoodOverOutlier(innovation, variance);
    absorb(h, scratch, innovation, variance);
  }
  const more = last - first;
  const logMasses = {
    'bad session': more * Math.log(OUTLIER_SHARE_AFTER_OUTLIER / OUTLIER_SHARE),
    'bad arrival': 0,
    wandering: goodOverOutlier,
  };
  const total = logSumExp(Object.values(logMasses));
  return {
    explanations: Object.fromEntries(Object.entries(logMasses).map(([name, mass]) => [name, Math.exp(mass - total)])),
    logBayesFactor: -goodOverOutlier + (more + 1) * Math.log((1 - OUTLIER_SHARE) / OUTLIER_SHARE),
  };
}
