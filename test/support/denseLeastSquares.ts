import type { Walks } from '../../detectors/filter/stateSpace.ts';
import { choleskyFactor, logDeterminant, solveLower } from '../../detectors/math/cholesky.ts';
import { leastSquares } from '../../detectors/math/orthogonalBasis.ts';

/**
 * Generalised least squares the long way, as the filter's outside authority: the full covariance of the arrivals from
 * the closed-form covariance functions of the Wiener process and its integrals (min(s, t); s²(3t − s)/6;
 * s³(10t² − 5st + s²)/120 for s ≤ t), factored whole.
 */
export interface DenseFit {
  readonly solution: Float64Array;
  readonly covariance: Float64Array;
  /** −½ (yᵀC⁻¹y minimised + ln det C + ln det XᵀC⁻¹X), without 2π. */
  readonly logLikelihood: number;
  readonly residualSumOfSquares: number;
}

function walkCovariance(days: readonly number[], walks: Walks): Float64Array {
  const n = days.length;
  const covariance = new Float64Array(n * n);
  for (let i = 0; i < n; i++) {
    for (let j = 0; j < n; j++) {
      const s = Math.min(days[i]!, days[j]!) - days[0]!;
      const t = Math.max(days[i]!, days[j]!) - days[0]!;
      covariance[i * n + j] =
        walks.phaseWalk * s +
        (walks.frequencyWalk * s * s * (3 * t - s)) / 6 +
        (walks.torqueWalk * s ** 3 * (10 * t * t - 5 * s * t + s * s)) / 120;
    }
  }
  return covariance;
}

/** @param priorSd of each column's parameter; absent: flat. */
export function denseFit(
  days: readonly number[],
  variances: readonly number[],
  walks: Walks,
  columns: readonly Float64Array[],
  y: Float64Array,
  priorSd?: readonly number[],
): DenseFit {
  const n = days.length;
  const c = walkCovariance(days, walks);
  for (let i = 0; i < n; i++) c[i * n + i]! += variances[i]!;
  if (choleskyFactor(c, n) !== n) throw new Error('the covariance is not positive definite');
  const priorRows = priorSd?.length ?? 0;
  const whiten = (raw: Float64Array, place: number): Float64Array => {
    const column = Float64Array.from(raw);
    solveLower(c, n, column);
    const extended = new Float64Array(n + priorRows);
    extended.set(column);
    if (priorSd && place >= 0) extended[n + place] = 1 / priorSd[place]!;
    return extended;
  };
  const fit = leastSquares(columns.map(whiten), whiten(y, -1));
  const lnPrior = priorSd?.reduce((sum, sd) => sum + 2 * Math.log(sd), 0) ?? 0;
  return {
    solution: fit.solution,
    covariance: fit.covariance,
    residualSumOfSquares: fit.residualSumOfSquares,
    logLikelihood: -0.5 * (fit.residualSumOfSquares + logDeterminant(c, n) + fit.logDeterminant + lnPrior),
  };
}
