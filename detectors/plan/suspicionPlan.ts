/**
 * How many more sessions settle a suspicion. With the event and without it the phase is expected to go apart by D(t); under
 * either, the log odds after more arrivals are normal with mean L ± λ/2 and variance λ, where λ is the whitened sum of
 * D² (Wald 1945 for the drift of a log likelihood ratio).
 */

import { normalTail } from '../math/normal.ts';
import { absorb, copyOf, gapOf, type Hypothesis, predict, propagate, zeros } from '../steps/hypothesis.ts';
import type { PulsarEvent } from '../steps/pulsarEvent.ts';
import type { PulsarWatch } from '../steps/pulsarWatch.ts';
import { lastMjd, nextUsualTime, SIDEREAL_DAY, usualVariance } from './ahead.ts';

export interface SuspicionPlan {
  readonly event: string;
  /** Natural-log posterior odds today, and those that confirm. */
  readonly logOdds: number;
  readonly confirmLogOdds: number;
  readonly options: readonly SuspicionOption[];
}

export interface SuspicionOption {
  readonly everyDays: number;
  /** Sessions that confirm or dismiss it with 90 % probability; null: more than there is room for in the table of gaps. */
  readonly sessions: number | null;
  readonly settledByMjd: number | null;
  /** Chance of being settled after one, two, three… sessions. */
  readonly chanceAfter: readonly number[];
}

const CADENCES_SIDEREAL_DAYS = [1, 2, 3, 7];
const MOST_SESSIONS = 60;
const SETTLED = 0.9;
const SHOWN = 10;

export function planForSuspicion(watch: PulsarWatch, event: PulsarEvent, asOfMjd: number): SuspicionPlan | null {
  const track = watch.tracks.find((t) => t.id === event.id) ?? watch.tracks.findLast((t) => t.state === 'suspected');
  const apart = differenceOf(watch);
  if (track === undefined || apart === null) return null;
  const { confirmLogOdds } = watch.settings;
  const first = nextUsualTime(watch, asOfMjd);
  const options = CADENCES_SIDEREAL_DAYS.map((cadence): SuspicionOption => {
    const everyDays = cadence * SIDEREAL_DAY;
    const chances = chancesOf(watch, apart, { first, everyDays, logOdds: track.logOdds });
    const sessions = chances.findIndex((chance) => chance >= SETTLED) + 1;
    return {
      everyDays: cadence,
      sessions: sessions === 0 ? null : sessions,
      settledByMjd: sessions === 0 ? null : first + (sessions - 1) * everyDays,
      chanceAfter: chances.slice(0, SHOWN),
    };
  });
  return { event: event.id, logOdds: track.logOdds, confirmLogOdds, options };
}

/** State of the heaviest hypothesis of something new, less that of nothing new, with the latter's covariance. */
function differenceOf(watch: PulsarWatch): Hypothesis | null {
  const { beam, families } = watch.bank!;
  let best: Hypothesis | null = null;
  for (const family of families)
    for (const h of family.beam) if (best === null || h.logWeight > best.logWeight) best = h;
  if (best === null) return null;
  const quiet = copyOf(beam[0]!);
  for (let i = 0; i < quiet.mean.length; i++) quiet.mean[i] = best.mean[i]! - quiet.mean[i]!;
  return quiet;
}

/** After each session: chance that the odds are then above the threshold, or below even. */
function chancesOf(
  watch: PulsarWatch,
  apart: Hypothesis,
  given: { readonly first: number; readonly everyDays: number; readonly logOdds: number },
): number[] {
  const { noise, states, settings } = watch;
  const variance = usualVariance(watch);
  const h = copyOf(apart);
  const row = zeros(states.size);
  row[0] = 1;
  const scratch = { deviation: 0, variance: 0, gain: zeros(states.size), plain: true };
  const event = 1 / (1 + Math.exp(-given.logOdds));
  let information = 0;
  return Array.from({ length: MOST_SESSIONS }, (_, k) => {
    propagate(h, gapOf(k === 0 ? given.first - lastMjd(watch) : given.everyDays, noise, states.decays));
    predict(h, { row, seen: [0], plain: true }, scratch);
    const spread = scratch.variance + variance;
    information += scratch.deviation ** 2 / spread;
    absorb(h, scratch, -scratch.deviation, spread);
    const root = Math.sqrt(information);
    const confirmed = normalTail((settings.confirmLogOdds - given.logOdds - information / 2) / root);
    const dismissed = normalTail((given.logOdds - information / 2) / root);
    return event * confirmed + (1 - event) * dismissed;
  });
}
