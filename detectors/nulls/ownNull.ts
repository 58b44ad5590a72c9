/**
 * The odds that this pulsar must reach: those at which noise alone spends no more than its share of the operator's
 * budget. Its null is simulated only where that can matter, when a candidate has passed everything else but is not far
 * above Ville's bound; a quiet pulsar costs nothing.
 */

import { median } from '../math/median.ts';
import type { NoiseModel } from '../report.ts';
import type { PulsarWatch } from '../steps/pulsarWatch.ts';
import { TOTAL_RATE } from '../steps/threshold.ts';
import { type Demands, levelFor, type NullTail, nullTail, rateAt } from './nullTail.ts';

/** The tail, and what it was made from. It is made anew when the noise has been learned anew or the cadence has changed. */
export interface OwnNull {
  readonly noise: NoiseModel;
  readonly medianGapDays: number;
  readonly leastJointOdds: number;
  readonly tail: NullTail;
}

/** Where Ville's bound keeps the share this many times over, nothing is simulated. */
const TIMES_OVER = 10;
/** The cadence has changed when the median gap has, by this factor. */
const CADENCE_CHANGE = 1.5;
const RECENT_GAPS = 30;

/** Natural-log odds that a candidate of `logOdds` must reach. */
export function requiredLogOdds(watch: PulsarWatch, logOdds: number, demands: Demands): number {
  const { confirmLogOdds, falseAlertsPerYear } = watch.settings;
  const safe = Math.log((TIMES_OVER * TOTAL_RATE) / falseAlertsPerYear);
  if (logOdds < confirmLogOdds || logOdds >= safe) return confirmLogOdds;
  return Math.max(confirmLogOdds, levelFor(tailOf(watch, demands), falseAlertsPerYear));
}

/** Of the whole programme, at these odds: by the pulsar's own null where it is known, else Ville's bound. */
export function falseAlertsPerYearAt({ settings, ownNull }: PulsarWatch, logOdds: number): number {
  const bound = TOTAL_RATE * Math.exp(-logOdds);
  return settings.pulsarsInProgramme * (ownNull === null ? bound : rateAt(ownNull.tail, logOdds));
}

function tailOf(watch: PulsarWatch, demands: Demands): NullTail {
  const medianGapDays = medianGap(watch);
  const known = watch.ownNull;
  const change = known === null ? Infinity : Math.abs(Math.log(medianGapDays / known.medianGapDays));
  if (
    known !== null &&
    known.noise === watch.noise &&
    known.leastJointOdds === demands.leastJointOdds &&
    change < Math.log(CADENCE_CHANGE)
  )
    return known.tail;
  const tail = nullTail(watch, demands);
  watch.ownNull = { noise: watch.noise, medianGapDays, leastJointOdds: demands.leastJointOdds, tail };
  return tail;
}

/** Between sessions. */
function medianGap({ line: { seen } }: PulsarWatch): number {
  const recent = seen.slice(-RECENT_GAPS - 1);
  const gaps = recent
    .slice(1)
    .flatMap((s, i) => (s.session === recent[i]!.session ? [] : [s.tDays - recent[i]!.tDays]));
  return gaps.length === 0 ? 1 : median(gaps);
}
