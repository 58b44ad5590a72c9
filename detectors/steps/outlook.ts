/** What a hypothesis expects of an arrival, as the receiver and the band of that arrival, or of another, would show it. */

import { copyOf, gapOf, type Hypothesis, type Prediction, predict, propagate, withState } from './hypothesis.ts';
import { newPrediction } from './leader.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { observationOf } from './timeline.ts';

/** What a hypothesis of day `tDays` makes of arrival `index`: deviation, turns, receiver and dispersion included. */
export function expectedDeviation(watch: PulsarWatch, h: Hypothesis, tDays: number, index: number): number {
  return expected(watch, h, tDays, index, index).deviation;
}

/** σ of that, turns; had it been seen as arrival `as` was, by its receiver and in its band. */
export function expectedSpread(watch: PulsarWatch, h: Hypothesis, tDays: number, index: number, as = index): number {
  return Math.sqrt(expected(watch, h, tDays, index, as).variance);
}

function expected(watch: PulsarWatch, from: Hypothesis, tDays: number, index: number, as: number): Prediction {
  const h = grownTo(watch, from);
  propagate(h, gapOf(watch.line.seen[index]!.tDays - tDays, watch.noise, watch.states.decays));
  return seenAs(watch, h, as);
}

/** The deviation as arrival `as` sees it. */
export function seenAs(watch: PulsarWatch, h: Hypothesis, as: number): Prediction {
  const prediction = newPrediction(h.mean.length);
  predict(h, observationOf(watch.line, as, watch.states, watch.noise).sight, prediction);
  return prediction;
}

/** A copy with the states that have come since: receivers, a band, recoveries. */
export function grownTo(watch: PulsarWatch, from: Hypothesis): Hypothesis {
  const current = watch.bank!.beam[0]!;
  const size = current.mean.length;
  let h = copyOf(from);
  for (let state = h.mean.length; state < size; state++) h = withState(h, current.cov[state * (size + 1)]!);
  return h;
}
