/** From the Gaussians at the points of a posterior to what is published: Δν, Δν̇, recovery fractions. */

import { BASE_SIZES } from './conditionalSizes.ts';
import type { GlitchPoint } from './glitchPosterior.ts';
import { type Estimate, mixtureEstimate } from './mixture.ts';

const SECONDS_PER_DAY = 86_400;
/** Turns per day, and per day², in Hz and Hz/s. */
export const HZ = 1 / SECONDS_PER_DAY;
export const HZ_PER_S = HZ / SECONDS_PER_DAY;

/**
 * An exponential of at most so many days that runs against the step, by so many standard deviations, is a part of the step
 * that arrives late: delayed rises took hours to two days (from memory: those of PSR B0531+21 in 1989, 1996 and 2017).
 */
const LONGEST_RISE_DAYS = 10;
const SURE_OF_SIGN = 2;

/** Weight, mean and sd of one Gaussian component. */
export interface Component {
  readonly share: number;
  readonly mean: number;
  readonly sd: number;
}

/** Whether exponential `j` of the point is a delayed rise. */
export function isRise({ mean, covariance, timescalesDays }: GlitchPoint, j: number): boolean {
  const at = BASE_SIZES + j;
  const against = -mean[at]! * Math.sign(mean[0]!);
  return timescalesDays[j]! <= LONGEST_RISE_DAYS && against > SURE_OF_SIGN * sdOf(covariance, mean.length, at);
}

function sdOf(covariance: Float64Array, count: number, i: number): number {
  return Math.sqrt(Math.max(0, covariance[i * count + i]!));
}

/** Coefficients of the sizes, by what they are: Δν_p, Δν̇_p, and each exponential. */
function direction(
  point: GlitchPoint,
  rate: number,
  second: number,
  of: (j: number) => number = () => 0,
): Float64Array {
  const coefficients = new Float64Array(point.mean.length);
  coefficients[0] = rate;
  coefficients[1] = second;
  for (let j = 0; j < point.timescalesDays.length; j++) coefficients[BASE_SIZES + j] = of(j);
  return coefficients;
}

/** The whole step: what stays and what decays again; what arrives late is part of what stays. */
export function total(point: GlitchPoint): Component[] {
  return project(point, wholeStep(point));
}

function wholeStep(point: GlitchPoint): Float64Array {
  return direction(point, 1, 0, (j) => (isRise(point, j) ? 0 : 1));
}

/** Δν̇_p − Σ Δνⱼ/τⱼ over what decays. */
export function totalSecond(point: GlitchPoint): Component[] {
  return project(
    point,
    direction(point, 0, 1, (j) => (isRise(point, j) ? 0 : -1 / point.timescalesDays[j]!)),
  );
}

export function persistent(point: GlitchPoint): Component[] {
  return project(point, direction(point, 1, 0));
}

export function persistentSecond(point: GlitchPoint): Component[] {
  return project(point, direction(point, 0, 1));
}

export function exponentialStep(j: number): (point: GlitchPoint) => Component[] {
  return (point) =>
    project(
      point,
      direction(point, 0, 0, (k) => (k === j ? 1 : 0)),
    );
}

/** Δνⱼ/Δν of one exponential. */
export function fraction(j: number): (point: GlitchPoint) => Component[] {
  return (point) =>
    ratio(
      point,
      direction(point, 0, 0, (k) => (k === j ? 1 : 0)),
      wholeStep(point),
    );
}

/** Q: the sum of the fractions that decay. */
export function recovered(point: GlitchPoint): Component[] {
  if (point.timescalesDays.length === 0) return [{ share: 1, mean: 0, sd: 0 }];
  return ratio(
    point,
    direction(point, 0, 0, (j) => (isRise(point, j) ? 0 : 1)),
    wholeStep(point),
  );
}

function project(point: GlitchPoint, coefficients: Float64Array): Component[] {
  return [
    { share: 1, mean: dot(coefficients, point.mean), sd: Math.sqrt(quadratic(point, coefficients, coefficients)) },
  ];
}

/** Abscissas and weights of the Gauss–Hermite rule with seven points for a standard normal variable. */
const NORMAL_NODES = [
  [0, 0.457142857142857],
  [1.154405394739968, 0.240123178605013],
  [2.366759410734541, 0.030757123967586],
  [3.750439717725742, 0.000548268855972],
] as const;

/**
 * The ratio of two Gaussian quantities: given the lower one it is Gaussian exactly, so the lower one is stepped through by
 * quadrature.
 */
function ratio(point: GlitchPoint, upper: Float64Array, lower: Float64Array): Component[] {
  const meanUpper = dot(upper, point.mean);
  const meanLower = dot(lower, point.mean);
  const varianceUpper = quadratic(point, upper, upper);
  const varianceLower = quadratic(point, lower, lower);
  if (varianceLower === 0)
    return [{ share: 1, mean: meanUpper / meanLower, sd: Math.sqrt(varianceUpper) / Math.abs(meanLower) }];
  const slope = quadratic(point, upper, lower) / varianceLower;
  const sdGiven = Math.sqrt(Math.max(0, varianceUpper - slope * slope * varianceLower));
  const sdLower = Math.sqrt(varianceLower);
  return NORMAL_NODES.flatMap(([z, share]) =>
    (z === 0 ? [0] : [-z, z]).map((node) => {
      const given = meanLower + node * sdLower;
      const mean = (meanUpper + slope * node * sdLower) / given;
      return { share, mean, sd: sdGiven / Math.abs(given) };
    }),
  );
}

function dot(a: Float64Array, b: Float64Array): number {
  let sum = 0;
  for (let i = 0; i < a.length; i++) sum += a[i]! * b[i]!;
  return sum;
}

/** aᵀ C b; never below 0 for a = b. */
function quadratic({ covariance }: GlitchPoint, a: Float64Array, b: Float64Array): number {
  const count = a.length;
  let sum = 0;
  for (let i = 0; i < count; i++) for (let j = 0; j < count; j++) sum += a[i]! * covariance[i * count + j]! * b[j]!;
  return a === b ? Math.max(0, sum) : sum;
}

/**
 * The estimate of a quantity over all points, by their masses.
 * @param unit factor from turns and days to the unit stated.
 */
export function marginal(points: readonly GlitchPoint[], of: (point: GlitchPoint) => Component[], unit = 1): Estimate {
  const weights: number[] = [];
  const means: number[] = [];
  const sds: number[] = [];
  const heaviest = heaviestOf(points);
  for (const point of points) {
    const weight = Math.exp(point.logMass - heaviest);
    for (const { share, mean, sd } of of(point)) {
      weights.push(share * weight);
      means.push(mean * unit);
      sds.push(sd * unit);
    }
  }
  return mixtureEstimate({
    weights: Float64Array.from(weights),
    means: Float64Array.from(means),
    sds: Float64Array.from(sds),
  });
}

export function heaviestOf(points: readonly GlitchPoint[]): number {
  return points.reduce((most, { logMass }) => Math.max(most, logMass), Number.NEGATIVE_INFINITY);
}

/** Deviation that the glitch adds, turns, with its counts. */
export function addedDeviation({ mean, timescalesDays, countShift, epochDays }: GlitchPoint, tDays: number): number {
  const since = tDays - epochDays;
  if (since <= 0) return 0;
  let turns = mean[0]! * since + 0.5 * mean[1]! * since * since;
  timescalesDays.forEach((timescale, j) => {
    turns -= mean[BASE_SIZES + j]! * timescale * Math.expm1(-since / timescale);
  });
  return -turns - countShift;
}

/** What it adds to ν, Hz. */
export function addedFrequency({ mean, timescalesDays, epochDays }: GlitchPoint, tDays: number): number {
  const since = tDays - epochDays;
  if (since <= 0) return 0;
  let rate = mean[0]! + mean[1]! * since;
  timescalesDays.forEach((timescale, j) => {
    rate += mean[BASE_SIZES + j]! * Math.exp(-since / timescale);
  });
  return rate * HZ;
}
