/** How far the hypotheses agree on the count of turns. */

import type { Hypothesis } from './hypothesis.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { observationOf } from './timeline.ts';

const ALIKE_TURNS = 0.3;

/**
 * Share of the weight of `among` that predicts the next arrivals as `best` does, up to whole turns that nobody sees: counts
 * that differ drift apart by a turn from one arrival to another; the same count with another whole number of turns does not.
 * The receiver of the last arrival stands for all: a turn may be shared between the rotation and an offset not yet known.
 */
export function shareOfCount(watch: PulsarWatch, best: Hypothesis, among = watch.bank!.beam): number {
  const { row, seen } = observationOf(watch.line, watch.line.seen.length - 1, watch.states, watch.noise).sight;
  const deviation = (h: Hypothesis) => seen.reduce((sum, state) => sum + row[state]! * h.mean[state]!, 0);
  const ofBest = deviation(best);
  const gapDays = meanGapDays(watch);
  const isAlike = (h: Hypothesis): boolean => {
    const apart = deviation(h) - ofBest;
    const numbered = h.numbering !== null || best.numbering !== null;
    const wrapped = numbered ? apart : apart - Math.round(apart);
    return Math.abs(wrapped) < ALIKE_TURNS && Math.abs(h.mean[1]! - best.mean[1]!) * gapDays < ALIKE_TURNS;
  };
  let agreeing = 0;
  let total = 0;
  for (const h of among) {
    const weight = Math.exp(h.logWeight - best.logWeight);
    total += weight;
    if (isAlike(h)) agreeing += weight;
  }
  return agreeing / total;
}

/** Of the latest arrivals. */
function meanGapDays({ bank }: PulsarWatch): number {
  const { snapshots } = bank!;
  const [first] = snapshots;
  const last = snapshots.at(-1)!;
  return (last.tDays - first!.tDays) / Math.max(1, last.index - first!.index);
}
