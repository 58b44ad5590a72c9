/** What the detector expects of a step before it sees it, taken from the births themselves, so that the two cannot differ. */

import { SPIN_STATES } from '../filter/stateSpace.ts';
import { born, type Kind } from '../steps/births.ts';
import { type Hypothesis, zeros } from '../steps/hypothesis.ts';
import { birthPlace } from '../steps/places.ts';
import type { PulsarWatch } from '../steps/pulsarWatch.ts';

/** One part of the mixture of sizes. */
export interface SizePrior {
  /** Natural log of rate × gap × share. */
  readonly logWeight: number;
  /** Of the steps in phase, rate and second derivative; 3×3, turns and days. */
  readonly covariance: readonly number[];
}

/** For an event of a kind in a gap of so many days, as at the last arrival. */
export function sizePriors(watch: PulsarWatch, kind: Kind, gapDays: number): SizePrior[] {
  const place = { ...birthPlace(watch, watch.line.seen.length - 1, gapDays), countKnown: true };
  const { size } = watch.states;
  const sure: Hypothesis = {
    ...watch.bank!.beam[0]!,
    mean: zeros(size),
    cov: zeros(size * size),
    logWeight: 0,
  };
  return born(kind, sure, place).map(({ logWeight, cov }) => ({
    logWeight,
    covariance: Array.from(
      { length: SPIN_STATES * SPIN_STATES },
      (_, i) => cov[Math.floor(i / SPIN_STATES) * size + (i % SPIN_STATES)]!,
    ),
  }));
}

/** The parts of a mixture that matter for a step of a rate (turns/day): the likeliest few. */
export function partsNear(priors: readonly SizePrior[], rateStep: number, count: number): SizePrior[] {
  const likelihood = ({ logWeight, covariance }: SizePrior) =>
    logWeight - 0.5 * (Math.log(covariance[4]!) + rateStep ** 2 / covariance[4]!);
  return [...priors].sort((a, b) => likelihood(b) - likelihood(a)).slice(0, count);
}
