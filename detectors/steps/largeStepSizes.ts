/** The sizes that the circular search has found for a large step, each taken as a hypothesis through the arrivals since. */

import { SPIN_STATES } from '../filter/stateSpace.ts';
import { logWeightOf, observe } from './beam.ts';
import { RATE_PER_YEAR } from './births.ts';
import { BEND_STEP_TURNS, LOG_SIZE_RANGE, logBendPrior, type SearchPeak } from './circularSearch.ts';
import { copyOf, type Decay, gapOf, type Hypothesis, propagate } from './hypothesis.ts';
import type { LargeStep } from './largeStep.ts';
import { grownTo } from './outlook.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { looseRecovery } from './recoveryStates.ts';
import { secondTimescale } from './recoveryTimescales.ts';
import { observationOf } from './timeline.ts';

/** Start models whose frequency is off by more than their stated errors allow (common practice, no source). */
const WRONG_START_SHARE = 0.05;
const DAYS_PER_YEAR = 365.25;
/** σ of the deviation at the first arrival, and of the step in widths of its peak: the recovery moves both. */
const START_SPREAD_TURNS = 0.1;
const SPREAD_WIDTHS = 4;
/** σ of Δν̇/ν̇. */
const RATE_STEP = 0.01;
/** Shares of the step that may decay again, and how often; the timescales tried, days. */
const RECOVERIES: readonly (readonly [chance: number, share: number])[] = [
  [0.5, 0],
  [0.3, 0.02],
  [0.2, 0.2],
];
const TIMESCALES_DAYS = [5, 10, 20, 40, 80, 160];
/** Closer timescales: ratios from the first down to the last, for so many sizes. */
const FIRST_RATIO = Math.SQRT2;
const LAST_RATIO = 1.01;
const HEAVIEST = 6;
/** Counts followed for each size, and kept of it. */
const FOLLOWED = 10;
const KEPT = 3;
const ROOT_TWO_PI = Math.sqrt(2 * Math.PI);

/** All sizes, with the timescales of the recovery that suit them best: those become the bank's own. */
export function bestFollowed(
  watch: PulsarWatch,
  peaks: readonly SearchPeak[],
  step: LargeStep,
  index: number,
): Hypothesis[] {
  const { decays } = watch.states;
  if (peaks.length === 0) return [];
  if (!watch.locked || decays.length < 2) return peaks.flatMap((peak) => followed(watch, peak, step, index, decays));
  const tried = TIMESCALES_DAYS.map((timescaleDays) => trialOf(watch, peaks, step, index, timescaleDays));
  let best = tried.reduce((a, b) => (b.logWeight > a.logWeight ? b : a));
  // A recovery that is seen precisely asks for its own timescale: the sizes that matter are followed with closer ones.
  for (let ratio = FIRST_RATIO; ratio > LAST_RATIO; ratio = Math.sqrt(ratio)) {
    const middle = best.decays[0]!.timescaleDays;
    for (const timescaleDays of [middle / ratio, middle * ratio]) {
      const closer = trialOf(watch, best.heaviest, step, index, timescaleDays);
      if (closer.logWeight > best.logWeight) best = closer;
    }
  }
  watch.states.decays = best.decays;
  watch.bank = { ...watch.bank!, decays: best.decays };
  return best.found;
}

/** The sizes followed with one timescale. */
interface TimescaleTrial {
  readonly decays: readonly Decay[];
  readonly found: Hypothesis[];
  readonly logWeight: number;
  /** The peaks of most weight. */
  readonly heaviest: readonly SearchPeak[];
}

function trialOf(
  watch: PulsarWatch,
  peaks: readonly SearchPeak[],
  step: LargeStep,
  index: number,
  timescaleDays: number,
): TimescaleTrial {
  const [first, second] = watch.states.decays as [Decay, Decay];
  const decays = [
    { ...first, timescaleDays },
    { ...second, timescaleDays: secondTimescale(timescaleDays) },
  ];
  const each = peaks.map((peak) => {
    const beam = followed(watch, peak, step, index, decays);
    return { peak, beam, logWeight: logWeightOf(beam) };
  });
  each.sort((a, b) => b.logWeight - a.logWeight);
  const found = each.flatMap(({ beam }) => beam);
  return {
    decays,
    found,
    logWeight: logWeightOf(found),
    heaviest: each.slice(0, HEAVIEST).map(({ peak }) => peak),
  };
}

/** The hypothesis of one peak, with and without a recovery, taken through the run. */
function followed(
  watch: PulsarWatch,
  peak: SearchPeak,
  { before: from, start }: LargeStep,
  index: number,
  decays: readonly Decay[],
): Hypothesis[] {
  const { seen } = watch.line;
  const gapDays = seen[start]!.tDays - from.tDays;
  const span = seen[index]!.tDays - seen[start]!.tDays;
  const h = grownTo(watch, from.hypothesis);
  propagate(h, gapOf(gapDays, watch.noise, decays));
  const size = h.mean.length;
  h.mean[0]! += peak.phase;
  h.mean[1]! -= peak.frequencyStep;
  h.mean[2]! += peak.curvature;
  // The epoch is open, so the deviation after the gap is too.
  for (let i = 1; i < size; i++) {
    h.cov[i] = 0;
    h.cov[i * size] = 0;
  }
  h.cov[0] = START_SPREAD_TURNS ** 2;
  h.cov[size + 1]! += (SPREAD_WIDTHS * peak.width) ** 2;
  const rateStep = RATE_STEP * Math.abs(watch.model.spin.frequencyDerivativeHzPerS) * 86_400 ** 2;
  const bendStep = (2 * BEND_STEP_TURNS) / (span * span);
  h.cov[(SPIN_STATES - 1) * (size + 1)]! += rateStep * rateStep + bendStep * bendStep;
  h.logWeight += logPrior(watch, peak, gapDays, span);
  let beam = watch.locked ? withRecoveries(h, decays, peak.frequencyStep) : [h];
  for (let i = start; i <= index; i++) {
    if (i > start) {
      const gap = gapOf(seen[i]!.tDays - seen[i - 1]!.tDays, watch.noise, decays);
      for (const b of beam) propagate(b, gap);
    }
    beam = observe(beam, observationOf(watch.line, i, watch.states, watch.noise), FOLLOWED, watch.bank!.scratch);
  }
  return beam.slice(0, KEPT);
}

/** Rate of such steps, and the shares of phase, size and bend that the peak stands for. */
function logPrior(watch: PulsarWatch, peak: SearchPeak, gapDays: number, span: number): number {
  const rate = watch.locked ? (RATE_PER_YEAR.glitch * gapDays) / DAYS_PER_YEAR : WRONG_START_SHARE;
  const size = Math.max(Math.abs(peak.frequencyStep), peak.width);
  const sizeShare = Math.min(1, (ROOT_TWO_PI * SPREAD_WIDTHS * peak.width) / (LOG_SIZE_RANGE * size));
  const bend = watch.locked ? logBendPrior(0.5 * peak.curvature * span * span) + Math.log(BEND_STEP_TURNS) : 0;
  return Math.log(rate * sizeShare * ROOT_TWO_PI * START_SPREAD_TURNS) + bend;
}

function withRecoveries(h: Hypothesis, decays: readonly Decay[], frequencyStep: number): Hypothesis[] {
  return RECOVERIES.map(([chance, share]) => {
    const child = copyOf(h);
    child.logWeight += Math.log(chance);
    looseRecovery(child, decays, share * Math.abs(frequencyStep));
    return child;
  });
}
