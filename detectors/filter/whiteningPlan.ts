import { SPIN_STATES, type Walks } from './stateSpace.ts';
import { absorbArrival, createWhiteningFilter, expectArrival, predict } from './whiteningFilter.ts';

/**
 * The whitening transform of one set of arrivals, kept so that any number of columns can be sent through it later: if C
 * is the covariance of the walks (from an exactly known start) plus measurement noise, a whitened column is L⁻¹ x with
 * L Lᵀ = C. Everything unknown at the start is then a column of its own with a flat prior.
 */
export interface WhiteningPlan {
  readonly count: number;
  readonly gapDays: Float64Array;
  /** count × 3 */
  readonly gains: Float64Array;
  readonly inverseDeviations: Float64Array;
  /** ln det C */
  readonly logDeterminant: number;
}

/** @param variances of each arrival, turns²; all positive. @param days in time order. */
export function planWhitening(days: ArrayLike<number>, variances: ArrayLike<number>, walks: Walks): WhiteningPlan {
  const count = days.length;
  const gapDays = new Float64Array(count);
  const gains = new Float64Array(count * SPIN_STATES);
  const inverseDeviations = new Float64Array(count);
  const filter = createWhiteningFilter([0, 0, 0], 0);
  const phaseOnly = Float64Array.of(1, 0, 0);
  let logDeterminant = 0;
  for (let i = 0; i < count; i++) {
    gapDays[i] = i === 0 ? 0 : days[i]! - days[i - 1]!;
    predict(filter, gapDays[i]!, walks);
    expectArrival(filter, phaseOnly);
    absorbArrival(filter, [], variances[i]!);
    gains.set(filter.gain, i * SPIN_STATES);
    inverseDeviations[i] = 1 / Math.sqrt(filter.innovationVariance);
    logDeterminant += Math.log(filter.innovationVariance);
  }
  return { count, gapDays, gains, inverseDeviations, logDeterminant };
}

/** Whitens a column in place; entries before `from` must be 0 (they stay so and cost nothing). */
export function whitenColumn(plan: WhiteningPlan, column: Float64Array, from = 0): void {
  const { count, gapDays, gains, inverseDeviations } = plan;
  let phase = 0;
  let rate = 0;
  let second = 0;
  for (let i = from; i < count; i++) {
    const t = gapDays[i]!;
    phase += t * (rate + 0.5 * t * second);
    rate += t * second;
    const innovation = column[i]! - phase;
    column[i] = innovation * inverseDeviations[i]!;
    phase += gains[3 * i]! * innovation;
    rate += gains[3 * i + 1]! * innovation;
    second += gains[3 * i + 2]! * innovation;
  }
}
