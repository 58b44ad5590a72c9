import { logAddExp } from '../math/logSumExp.ts';
import type { NoiseModel } from '../report.ts';
import type { CountedArrival, Disturbance } from './countedArrival.ts';
import { isInside, type NuisanceLayout, nuisanceLayout, writeOffsetDirection, writeSensitivity } from './nuisance.ts';
import { arrivalVariance, SPIN_STATES } from './stateSpace.ts';
import {
  absorbArrival,
  createWhiteningFilter,
  expectArrival,
  loosen,
  predict,
  setPrior,
  type WhiteningFilter,
} from './whiteningFilter.ts';

/** Fraction of arrivals that are wrong in a way the uncertainty does not tell. */
const OUTLIER_FRACTION = 0.02;
/** Scatter of those, turns²: (2π)⁻¹ makes their density one per turn at its peak. */
const OUTLIER_VARIANCE = 1 / (2 * Math.PI);
const LN_OUTLIER_ODDS = Math.log(OUTLIER_FRACTION / (1 - OUTLIER_FRACTION));

/** One pulsar's arrivals, laid out once for many evaluations of the likelihood. */
export interface LearningProblem {
  readonly count: number;
  readonly medianSigmaTurns: number;
  readonly layout: NuisanceLayout;
  readonly gapDays: Float64Array;
  readonly deviations: Float64Array;
  readonly sigmas: Float64Array;
  readonly sensitivities: readonly Float64Array[];
  /** By position among the arrivals in use. */
  readonly loosenBefore: ReadonlyMap<number, readonly Loosening[]>;
  readonly priorSd: Float64Array;
  readonly filter: WhiteningFilter;
  readonly row: Float64Array;
  readonly value: Float64Array;
}

interface Loosening {
  readonly direction: Float64Array;
  readonly sd: number;
}

/** Lays out the arrivals in use. Deviations are taken relative to the first of them. */
export function learningProblem(
  arrivals: readonly CountedArrival[],
  disturbances: readonly Disturbance[],
): LearningProblem {
  const indices = arrivals.flatMap(({ used }, index) => (used ? [index] : []));
  const count = indices.length;
  const layout = nuisanceLayout(arrivals);
  const first = arrivals[indices[0] ?? 0];
  const gapDays = new Float64Array(count);
  const deviations = new Float64Array(count);
  const sigmas = new Float64Array(count);
  const sensitivities = indices.map(() => new Float64Array(layout.size));
  indices.forEach((index, i) => {
    const arrival = arrivals[index]!;
    gapDays[i] = i === 0 ? 0 : arrival.tDays - arrivals[indices[i - 1]!]!.tDays;
    deviations[i] = arrival.deviationTurns - first!.deviationTurns;
    sigmas[i] = arrival.sigmaTurns;
    writeSensitivity(layout, arrival, sensitivities[i]!);
  });
  const priorSd = widePrior(layout.size, gapDays, deviations);
  return {
    count,
    medianSigmaTurns: count === 0 ? 1e-3 : Float64Array.from(sigmas).sort()[count >> 1]!,
    layout,
    gapDays,
    deviations,
    sigmas,
    sensitivities,
    loosenBefore: loosenings(indices, disturbances, layout, priorSd),
    priorSd,
    filter: createWhiteningFilter(priorSd),
    row: new Float64Array(layout.size),
    value: new Float64Array(1),
  };
}

/** Ten times what the data could show: a constant factor of the likelihood, whatever the noise. */
function widePrior(size: number, gapDays: Float64Array, deviations: Float64Array): Float64Array {
  let range = 1;
  let span = 0;
  for (let i = 0; i < deviations.length; i++) {
    range = Math.max(range, Math.abs(deviations[i]!));
    span += gapDays[i]!;
  }
  const gap = Math.max(span / Math.max(1, deviations.length - 1), 1e-3);
  const sd = new Float64Array(size).fill(10 * range);
  sd[1] = (10 * range) / gap;
  sd[2] = (10 * range) / (gap * gap);
  return sd;
}

function loosenings(
  indices: readonly number[],
  disturbances: readonly Disturbance[],
  layout: NuisanceLayout,
  priorSd: Float64Array,
): Map<number, Loosening[]> {
  const found = new Map<number, Loosening[]>();
  if (indices.length === 0) return found;
  for (const disturbance of disturbances) {
    if (!isInside(disturbance, indices[0]!, indices.at(-1)!)) continue;
    const position = indices.findIndex((index) => index >= disturbance.beforeIndex);
    const list = found.get(position) ?? [];
    list.push(...loosened(disturbance, layout, priorSd));
    found.set(position, list);
  }
  return found;
}

function loosened(disturbance: Disturbance, layout: NuisanceLayout, priorSd: Float64Array): Loosening[] {
  const along = (state: number): Loosening => {
    const direction = new Float64Array(layout.size);
    direction[state] = 1;
    return { direction, sd: priorSd[state]! };
  };
  switch (disturbance.kind) {
    case 'spin':
      return Array.from({ length: SPIN_STATES }, (_, state) => along(state));
    case 'phase':
      return [along(0)];
    case 'dispersion':
      return layout.dispersionState === null ? [along(0)] : [along(layout.dispersionState)];
    case 'offset': {
      const direction = new Float64Array(layout.size);
      writeOffsetDirection(layout, disturbance.group ?? 0, direction);
      return [{ direction, sd: priorSd[0]! }];
    }
  }
}

/**
 * ln likelihood of the deviations, up to a constant. Each innovation e with variance S has the density
 * (1 − ε) N(e; S) + ε N(e; S + 1/2π): an inlier, or an arrival scattered over the turn. That is the alternative that
 * really occurs (interference, a wrong profile), it is the one that decisions use, and unlike a Student form it leaves
 * the core Gaussian, so that the scale keeps its meaning. The filter takes the arrival with the weight of an inlier.
 */
export function logLikelihood(problem: LearningProblem, noise: NoiseModel): number {
  const { count, gapDays, deviations, sigmas, sensitivities, loosenBefore, filter, row, value } = problem;
  setPrior(filter, problem.priorSd);
  let sum = 0;
  for (let i = 0; i < count; i++) {
    predict(filter, gapDays[i]!, noise);
    const freed = loosenBefore.get(i);
    if (freed) for (const { direction, sd } of freed) loosen(filter, direction, sd, row);
    expectArrival(filter, sensitivities[i]!);
    const variance = arrivalVariance(sigmas[i]!, noise);
    const total = filter.expectedVariance + variance;
    const e2 = (deviations[i]! - filter.expected[0]!) ** 2;
    const wide = total + OUTLIER_VARIANCE;
    const lnInlier = -0.5 * (e2 / total + Math.log(total));
    const lnOutlier = LN_OUTLIER_ODDS - 0.5 * (e2 / wide + Math.log(wide));
    sum += logAddExp(lnInlier, lnOutlier);
    const inlier = 1 / (1 + Math.exp(lnOutlier - lnInlier));
    if (inlier < 1e-6) continue;
    value[0] = deviations[i]!;
    absorbArrival(filter, value, variance / inlier);
  }
  return sum;
}
