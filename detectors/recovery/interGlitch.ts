import type { CountedArrival } from '../filter/countedArrival.ts';
import { dispersionCoefficient, nuisanceLayout } from '../filter/nuisance.ts';
import { arrivalVariance } from '../filter/stateSpace.ts';
import { planWhitening, whitenColumn } from '../filter/whiteningPlan.ts';
import { leastSquares } from '../math/orthogonalBasis.ts';
import type { NoiseModel } from '../report.ts';

const SECONDS_PER_DAY = 86_400;

/**
 * Departure of ν̈ from the model over a stretch without events, Hz/s², by generalised least squares under the learned noise:
 * phase, ν, ν̇, ν̈, offsets and dispersion free, and an exponential for each recovery still running.
 */
export function secondDerivative(
  arrivals: readonly CountedArrival[],
  noise: NoiseModel,
  runningTimescalesDays: readonly number[],
): { readonly mean: number; readonly sd: number } | null {
  const used = arrivals.filter((a) => a.used);
  const first = used[0]?.tDays ?? 0;
  const span = (used.at(-1)?.tDays ?? 0) - first;
  const layout = nuisanceLayout(used);
  const shapes: ((arrival: CountedArrival) => number)[] = [3, 0, 1, 2].map(
    (power) =>
      ({ tDays }) =>
        ((tDays - first) / span) ** power,
  );
  for (const timescale of runningTimescalesDays) shapes.push(({ tDays }) => Math.exp((first - tDays) / timescale));
  for (const group of layout.offsetStates.keys()) shapes.push((arrival) => (arrival.group === group ? 1 : 0));
  if (layout.dispersionState !== null) shapes.push(({ frequencyMhz }) => dispersionCoefficient(frequencyMhz));
  if (used.length <= shapes.length || span === 0) return null;
  const plan = planWhitening(
    used.map(({ tDays }) => tDays),
    used.map(({ sigmaTurns }) => arrivalVariance(sigmaTurns, noise)),
    noise,
  );
  const whitened = (value: (arrival: CountedArrival) => number): Float64Array => {
    const column = Float64Array.from(used, value);
    whitenColumn(plan, column);
    return column;
  };
  const fit = leastSquares(
    shapes.map(whitened),
    whitened(({ deviationTurns }) => deviationTurns),
  );
  if (fit.rank < shapes.length) return null;
  // A pulse is late by what the rotation lacks; the cubic term is ν̈ t³/6.
  const unit = -6 / (span * SECONDS_PER_DAY) ** 3;
  return { mean: unit * fit.solution[0]!, sd: Math.abs(unit) * Math.sqrt(fit.covariance[0]!) };
}
