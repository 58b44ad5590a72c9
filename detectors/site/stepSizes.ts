/** The size of a step, from all that its pulsars say once it is allowed for. */

import type { BelievedStep } from './belief.ts';
import { witnessOf } from './candidates.ts';
import { commonStep } from './commonStep.ts';
import type { GapEvidence } from './gapEvidence.ts';

/** A larger correction, in standard deviations of the size, is no correction: a step that is not known yet spoils the sessions. */
const MOST_DEVIATIONS = 8;

/** What is left of the step in its gap, once it is allowed for, corrects its size. */
export function resized(step: BelievedStep, gaps: readonly GapEvidence[]): BelievedStep {
  const witnesses = gaps.filter(({ afterMjd }) => afterMjd <= step.afterMjd).map((gap) => witnessOf(gap, gap.all));
  if (witnesses.length === 0) return step;
  const { stepS, uncertaintyS } = commonStep(witnesses);
  if (Math.abs(stepS * 1e6) > MOST_DEVIATIONS * step.uncertaintyUs) return step;
  return { ...step, stepUs: step.stepUs + stepS * 1e6, uncertaintyUs: uncertaintyS * 1e6 };
}

/** What is found again in the gap of a step known already is a correction of its size. */
export function withStep(steps: readonly BelievedStep[], news: BelievedStep): BelievedStep[] {
  const same = steps.findIndex(
    (step) => step.site === news.site && step.receiver === news.receiver && step.afterMjd === news.afterMjd,
  );
  if (same < 0) return [...steps, news];
  const old = steps[same]!;
  const corrected = { ...old, stepUs: old.stepUs + news.stepUs, uncertaintyUs: news.uncertaintyUs };
  return steps.map((step, i) => (i === same ? corrected : step));
}
