import { normalTail } from '../math/normal.ts';
import type { Interval } from '../steps/pulsarEvent.ts';

/** A quantity's marginal posterior: moments, median, and central intervals that hold 68.27 % and 95.45 %. */
export interface Estimate {
  readonly mean: number;
  readonly median: number;
  readonly sd: number;
  readonly interval68: Interval;
  readonly interval95: Interval;
}

/** P(|Z| < 1) and P(|Z| < 2) of a normal variable. */
const WITHIN_ONE = 1 - 2 * normalTail(1);
const WITHIN_TWO = 1 - 2 * normalTail(2);

/** A mixture of Gaussians; weights need not be normalised. An sd of 0 is a point. */
export interface GaussianMixture {
  readonly weights: Float64Array;
  readonly means: Float64Array;
  readonly sds: Float64Array;
}

export function mixtureEstimate(mixture: GaussianMixture): Estimate {
  const fewer = condense(mixture);
  return estimate(moments(mixture), (probability) => mixtureQuantile(fewer, probability));
}

/**
 * Joins neighbours of nearly equal width whose means lie within a fifth of it, keeping their moments: thousands of grid
 * points become few components, and no quantile moves by more than a hundredth of a standard deviation. Components
 * lighter than 1e-12 of the heaviest are dropped.
 */
export function condense({ weights, means, sds }: GaussianMixture): GaussianMixture {
  const widthClass = Array.from(sds, (sd) => Math.round(8 * Math.log(sd)));
  const least = 1e-12 * weights.reduce((most, weight) => Math.max(most, weight), 0);
  const heavy = Array.from(means.keys()).filter((i) => weights[i]! > least);
  const order = heavy.sort((a, b) => widthClass[a]! - widthClass[b]! || means[a]! - means[b]!);
  const joined: { weight: number; mean: number; variance: number }[] = [];
  for (let from = 0; from < order.length; ) {
    const first = order[from]!;
    let weight = 0;
    let sum = 0;
    let squares = 0;
    let to = from;
    for (; to < order.length; to++) {
      const i = order[to]!;
      const away = means[i]! - means[first]!;
      if (widthClass[i] !== widthClass[first] || away > 0.2 * sds[first]!) break;
      weight += weights[i]!;
      sum += weights[i]! * away;
      squares += weights[i]! * (away * away + sds[i]! ** 2);
    }
    const shift = sum / weight;
    joined.push({ weight, mean: means[first]! + shift, variance: Math.max(0, squares / weight - shift * shift) });
    from = to;
  }
  return {
    weights: Float64Array.from(joined, ({ weight }) => weight),
    means: Float64Array.from(joined, ({ mean }) => mean),
    sds: Float64Array.from(joined, ({ variance }) => Math.sqrt(variance)),
  };
}

/** x below which the mixture holds `probability`: regula falsi (Illinois) on the distribution function. */
export function mixtureQuantile({ weights, means, sds }: GaussianMixture, probability: number): number {
  let total = 0;
  let low = Number.POSITIVE_INFINITY;
  let high = Number.NEGATIVE_INFINITY;
  for (let i = 0; i < weights.length; i++) {
    total += weights[i]!;
    low = Math.min(low, means[i]! - 8 * sds[i]!);
    high = Math.max(high, means[i]! + 8 * sds[i]!);
  }
  const excess = (x: number): number => {
    let sum = 0;
    for (let i = 0; i < weights.length; i++) sum += weights[i]! * cumulative((x - means[i]!) / sds[i]!);
    return sum / total - probability;
  };
  const smallest = 1e-10 * (high - low);
  let atLow = -probability;
  let atHigh = 1 - probability;
  for (let k = 0; k < 100 && high - low > smallest; k++) {
    // Every third step halves the bracket, so that a flat stretch between two components cannot stall the search.
    const x = k % 3 === 2 ? 0.5 * (low + high) : (low * atHigh - high * atLow) / (atHigh - atLow);
    const value = excess(x);
    if (Math.abs(value) < 1e-7) return x;
    if (value < 0) {
      low = x;
      atLow = value;
      atHigh *= 0.5;
    } else {
      high = x;
      atHigh = value;
      atLow *= 0.5;
    }
  }
  return 0.5 * (low + high);
}

/** The estimate of a quantity known on weighted grid points, each standing for what lies nearest to it. */
export function gridEstimate(values: Float64Array, weights: Float64Array): Estimate {
  const byValue = new Map<number, number>();
  values.forEach((value, i) => {
    byValue.set(value, (byValue.get(value) ?? 0) + weights[i]!);
  });
  const grid = [...byValue].sort((a, b) => a[0] - b[0]);
  const total = grid.reduce((sum, [, weight]) => sum + weight, 0);
  const border = (i: number): number => 0.5 * (grid[Math.max(i - 1, 0)]![0] + grid[Math.min(i, grid.length - 1)]![0]);
  const quantile = (probability: number): number => {
    let left = probability * total;
    let i = 0;
    while (i < grid.length - 1 && left > grid[i]![1]) left -= grid[i++]![1];
    return border(i) + (left / grid[i]![1]) * (border(i + 1) - border(i));
  };
  return estimate(moments({ weights, means: values, sds: new Float64Array(values.length) }), quantile);
}

/** The estimate of a quantity whose logarithm is distributed as the mixture. */
export function logNormalEstimate(mixture: GaussianMixture): Estimate {
  const { weights, means, sds } = mixture;
  const fewer = condense(mixture);
  return estimate(
    moments({
      weights,
      means: means.map((mean, i) => Math.exp(mean + 0.5 * sds[i]! ** 2)),
      sds: means.map((mean, i) => Math.exp(mean + 0.5 * sds[i]! ** 2) * Math.sqrt(Math.expm1(sds[i]! ** 2))),
    }),
    (probability) => Math.exp(mixtureQuantile(fewer, probability)),
  );
}

function estimate(
  { mean, sd }: { readonly mean: number; readonly sd: number },
  quantile: (probability: number) => number,
): Estimate {
  const central = (within: number): Interval => [quantile(0.5 - within / 2), quantile(0.5 + within / 2)];
  return { mean, sd, median: quantile(0.5), interval68: central(WITHIN_ONE), interval95: central(WITHIN_TWO) };
}

export function moments({ weights, means, sds }: GaussianMixture): { mean: number; sd: number } {
  let total = 0;
  let first = 0;
  for (let i = 0; i < weights.length; i++) {
    total += weights[i]!;
    first += weights[i]! * means[i]!;
  }
  const mean = first / total;
  let second = 0;
  for (let i = 0; i < weights.length; i++) second += weights[i]! * ((means[i]! - mean) ** 2 + sds[i]! ** 2);
  return { mean, sd: Math.sqrt(second / total) };
}

function cumulative(z: number): number {
  if (!(z < 8)) return z > 0 ? 1 : 0.5;
  return z < -8 ? 0 : normalTail(-z);
}
