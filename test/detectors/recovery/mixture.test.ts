import { quantileRankSorted } from 'simple-statistics';
import { describe, expect, it } from 'vitest';
import {
  condense,
  gridEstimate,
  logNormalEstimate,
  mixtureEstimate,
  mixtureQuantile,
} from '../../../detectors/recovery/mixture.ts';
import { dice } from '../../support/simulatedPulsar.ts';

describe('marginals of a mixture', () => {
  it('of one Gaussian are its mean ± σ and ± 2σ', () => {
    const { mean, median, sd, interval68, interval95 } = mixtureEstimate({
      weights: Float64Array.of(3),
      means: Float64Array.of(5),
      sds: Float64Array.of(0.5),
    });
    expect([mean, sd]).toEqual([5, 0.5]);
    for (const [value, expected] of [
      [median, 5],
      [interval68[0], 4.5],
      [interval68[1], 5.5],
      [interval95[0], 4],
      [interval95[1], 6],
    ] as const) {
      expect(value).toBeCloseTo(expected, 5);
    }
  });

  it('are those of a large sample (ranks by simple-statistics)', () => {
    const mixture = {
      weights: Float64Array.of(1, 2, 0.5),
      means: Float64Array.of(-1, 0.3, 8),
      sds: Float64Array.of(0.2, 1, 0.05),
    };
    const { uniform, normal } = dice(41);
    const sample = Array.from({ length: 200_000 }, () => {
      const pick = 3.5 * uniform();
      const i = pick < 1 ? 0 : pick < 3 ? 1 : 2;
      return mixture.means[i]! + mixture.sds[i]! * normal();
    }).sort((a, b) => a - b);
    for (const probability of [0.023, 0.16, 0.5, 0.84, 0.977]) {
      const below = quantileRankSorted(sample, mixtureQuantile(mixture, probability));
      // Four binomial standard deviations.
      const allowed = 4 * Math.sqrt((probability * (1 - probability)) / sample.length);
      expect(Math.abs(below - probability)).toBeLessThan(allowed);
    }
  });

  it('hardly move when neighbours are joined', () => {
    const { uniform } = dice(42);
    const count = 3000;
    const mixture = {
      weights: Float64Array.from({ length: count }, uniform),
      means: Float64Array.from({ length: count }, (_, i) => Math.sin(i)),
      sds: Float64Array.from({ length: count }, () => 0.1 + 0.3 * uniform()),
    };
    const fewer = condense(mixture);
    expect(fewer.weights.length).toBeLessThan(count / 5);
    const { sd } = mixtureEstimate(mixture);
    for (const probability of [0.02, 0.16, 0.5, 0.84, 0.98]) {
      const shift = mixtureQuantile(fewer, probability) - mixtureQuantile(mixture, probability);
      expect(Math.abs(shift)).toBeLessThan(0.01 * sd);
    }
  });

  it('of a grid follow its weights', () => {
    const values = Float64Array.from({ length: 101 }, (_, i) => i / 100);
    const even = gridEstimate(values, new Float64Array(101).fill(1));
    expect(even.median).toBeCloseTo(0.5, 2);
    expect(even.interval68[0]).toBeCloseTo(0.1587, 2);
    // Standard deviation of a uniform variable: 1/√12.
    expect(even.sd).toBeCloseTo(1 / Math.sqrt(12), 2);
    expect(gridEstimate(Float64Array.of(3), Float64Array.of(1)).interval95).toEqual([3, 3]);
  });

  it('of a coarse grid over a normal density are hardly wider than its own', () => {
    const values = Float64Array.from({ length: 15 }, (_, i) => 0.71 * (i - 7));
    const { interval68, interval95 } = gridEstimate(
      values,
      values.map((x) => Math.exp(-0.5 * x * x)),
    );
    for (const [bound, expected] of [
      [interval68[0], -1],
      [interval68[1], 1],
      [interval95[0], -2],
      [interval95[1], 2],
    ] as const) {
      expect(Math.abs(bound - expected)).toBeLessThan(0.08);
    }
  });

  it('of the exponential of a normal variable are the exponentials of its own (log-normal distribution)', () => {
    const { mean, median, sd, interval68, interval95 } = logNormalEstimate({
      weights: Float64Array.of(2),
      means: Float64Array.of(1.3),
      sds: Float64Array.of(0.4),
    });
    expect(mean).toBeCloseTo(Math.exp(1.3 + 0.08), 9);
    expect(sd).toBeCloseTo(Math.exp(1.3 + 0.08) * Math.sqrt(Math.exp(0.16) - 1), 9);
    expect(median).toBeCloseTo(Math.exp(1.3), 5);
    expect(interval68[0]).toBeCloseTo(Math.exp(0.9), 5);
    expect(interval95[1]).toBeCloseTo(Math.exp(2.1), 5);
  });
});
