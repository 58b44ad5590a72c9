import { describe, expect, it } from 'vitest';
import {
  absorbArrival,
  covariance,
  createWhiteningFilter,
  expectArrival,
  loosen,
  predict,
  type WhiteningFilter,
} from '../../../detectors/filter/whiteningFilter.ts';
import { planWhitening, whitenColumn } from '../../../detectors/filter/whiteningPlan.ts';
import { leastSquares } from '../../../detectors/math/orthogonalBasis.ts';
import { type DenseFit, denseFit } from '../../support/denseLeastSquares.ts';
import { type Dice, dice, observingDays, simulateWalk } from '../../support/simulatedPulsar.ts';

/** The largest relative difference that the filter may have from dense generalised least squares. */
const TOLERANCE = 1e-8;
const CASES = 60;

interface Case {
  readonly days: number[];
  readonly variances: number[];
  readonly walks: { phaseWalk: number; frequencyWalk: number; torqueWalk: number };
  /** Rows of the static states: offset of the second receiver, dispersion. */
  readonly statics: [number, number][];
  readonly y: Float64Array;
}

/** Cadences of 0.3 to 30 days, errors of 1e-5 to 1e-1 turn, walks from none to dominant, some arrivals at equal times. */
function randomCase(random: Dice): Case {
  const { uniform, normal } = random;
  const count = 12 + Math.floor(50 * uniform());
  const cadence = 0.3 * 100 ** uniform();
  const days = observingDays(count, cadence, 0.9, random);
  for (let i = 1; i < count; i++) if (uniform() < 0.1) days[i] = days[i - 1]!;
  const sigma = 10 ** (-1 - 4 * uniform());
  const strength = (): number => (uniform() < 0.2 ? 0 : sigma ** 2 * 10 ** (4 * uniform() - 3));
  const walks = {
    phaseWalk: strength() / cadence,
    frequencyWalk: strength() / cadence ** 3,
    torqueWalk: strength() / cadence ** 5,
  };
  const variances = days.map(() => (sigma * (0.5 + uniform())) ** 2);
  const statics = days.map((): [number, number] => [uniform() < 0.4 ? 1 : 0, uniform() < 0.5 ? 4 : 1]);
  const walk = simulateWalk(days, walks, random);
  const y = Float64Array.from(days, (t, i) => {
    const [offset, dispersion] = statics[i]!;
    const spin = 0.3 + (0.02 * t) / cadence - 1e-4 * (t / cadence) ** 2;
    return spin + walk[i]! + 0.1 * offset - 0.05 * dispersion + Math.sqrt(variances[i]!) * normal();
  });
  return { days, variances, walks, statics, y };
}

/** Spin at the first arrival, offset, dispersion. */
function designOf({ days, statics }: Case): Float64Array[] {
  const since = (i: number): number => days[i]! - days[0]!;
  return [
    Float64Array.from(days, () => 1),
    Float64Array.from(days, (_, i) => since(i)),
    Float64Array.from(days, (_, i) => 0.5 * since(i) ** 2),
    Float64Array.from(statics, ([offset]) => offset),
    Float64Array.from(statics, ([, dispersion]) => dispersion),
  ];
}

/** Difference from the dense fit, each estimate in units of its own uncertainty or size, whichever is larger. */
function difference(dense: DenseFit, solution: Float64Array, covariances: Float64Array, logLikelihood: number): number {
  const p = solution.length;
  let largest = Math.abs(logLikelihood - dense.logLikelihood) / Math.max(1, Math.abs(dense.logLikelihood));
  for (let a = 0; a < p; a++) {
    const sdA = Math.sqrt(dense.covariance[a * p + a]!);
    const scale = Math.max(sdA, Math.abs(dense.solution[a]!));
    largest = Math.max(largest, Math.abs(solution[a]! - dense.solution[a]!) / scale);
    for (let b = 0; b < p; b++) {
      const sdB = Math.sqrt(dense.covariance[b * p + b]!);
      largest = Math.max(largest, Math.abs(covariances[a * p + b]! - dense.covariance[a * p + b]!) / (sdA * sdB));
    }
  }
  return largest;
}

describe('the filter is generalised least squares', () => {
  it(`whitened columns, flat priors: ${CASES} random cases`, () => {
    const random = dice(11);
    let largest = 0;
    for (let k = 0; k < CASES; k++) {
      const given = randomCase(random);
      const columns = designOf(given);
      const dense = denseFit(given.days, given.variances, given.walks, columns, given.y);
      const plan = planWhitening(given.days, given.variances, given.walks);
      const y = Float64Array.from(given.y);
      for (const column of [...columns, y]) whitenColumn(plan, column);
      const fit = leastSquares(columns, y);
      const logLikelihood = -0.5 * (fit.residualSumOfSquares + plan.logDeterminant + fit.logDeterminant);
      largest = Math.max(largest, difference(dense, fit.solution, fit.covariance, logLikelihood));
    }
    console.log(`largest difference of the whitened columns from dense least squares: ${largest.toExponential(1)}`);
    expect(largest).toBeLessThan(TOLERANCE);
  });

  it(`states with wide priors, run through time: ${CASES} random cases`, () => {
    const random = dice(12);
    let largest = 0;
    for (let k = 0; k < CASES; k++) {
      const given = randomCase(random);
      const prior = [30, 3, 0.3, 10, 10];
      const dense = denseFit(given.days, given.variances, given.walks, designOf(given), given.y, prior);
      const filter = createWhiteningFilter(prior);
      const logLikelihood = run(filter, given);
      // Static states alone can be compared at the end: the spin has moved on since the first arrival.
      largest = Math.max(largest, Math.abs(logLikelihood - dense.logLikelihood) / Math.abs(dense.logLikelihood));
      for (const state of [3, 4]) {
        const sd = Math.sqrt(dense.covariance[state * 5 + state]!);
        const scale = Math.max(sd, Math.abs(dense.solution[state]!));
        largest = Math.max(largest, Math.abs(filter.means[state]! - dense.solution[state]!) / scale);
        largest = Math.max(largest, Math.abs(Math.sqrt(covariance(filter, state, state)) / sd - 1));
      }
    }
    console.log(`largest difference of the running filter from dense least squares: ${largest.toExponential(1)}`);
    expect(largest).toBeLessThan(TOLERANCE);
  });

  it('sends signatures through the gains of the data: columns of one filter are the columns of the plan', () => {
    const given = randomCase(dice(13));
    const columns = [given.y, ...designOf(given)];
    const filter = createWhiteningFilter([0, 0, 0], columns.length);
    const plan = planWhitening(given.days, given.variances, given.walks);
    const planned = columns.map((column) => Float64Array.from(column));
    for (const column of planned) whitenColumn(plan, column);
    const lengths = planned.map((column) => Math.hypot(...column));
    const row = Float64Array.of(1, 0, 0);
    given.days.forEach((day, i) => {
      predict(filter, i === 0 ? 0 : day - given.days[i - 1]!, given.walks);
      expectArrival(filter, row);
      absorbArrival(
        filter,
        columns.map((column) => column[i]!),
        given.variances[i]!,
      );
      columns.forEach((_, c) => {
        const whitened = filter.innovations[c]! / Math.sqrt(filter.innovationVariance);
        expect(Math.abs(whitened - planned[c]![i]!)).toBeLessThan(1e-11 * lengths[c]!);
      });
    });
  });

  it('sets a direction free: P grows by sd² v vᵀ', () => {
    const given = randomCase(dice(14));
    const filter = createWhiteningFilter([30, 3, 0.3, 10, 10]);
    run(filter, given);
    const before = matrix(filter);
    const direction = Float64Array.of(1, -0.5, 0, 2, 0.25);
    loosen(filter, direction, 0.7, new Float64Array(5));
    matrix(filter).forEach((entry, k) => {
      const added = 0.49 * direction[Math.floor(k / 5)]! * direction[k % 5]!;
      expect(Math.abs(entry - before[k]! - added)).toBeLessThan(1e-13 * (1 + Math.abs(entry)));
    });
  });
});

describe('the filter over a million arrivals', () => {
  it('keeps P symmetric and positive, and forgets where it began', () => {
    const { uniform, normal } = dice(15);
    const walks = { phaseWalk: 1e-10, frequencyWalk: 1e-12, torqueWalk: 1e-17 };
    const wide = createWhiteningFilter([1e4, 1e2, 1, 1e3, 1e3]);
    const narrow = createWhiteningFilter([1, 1e-2, 1e-4, 1e3, 1e3]);
    const row = new Float64Array(5);
    const value = new Float64Array(1);
    let squares = 0;
    const steps = 1_000_000;
    for (let i = 0; i < steps; i++) {
      row.set([1, 0, 0, uniform() < 0.5 ? 1 : 0, uniform() < 0.5 ? 2 : 1]);
      value[0] = 1e-3 * normal();
      const gap = uniform() < 0.01 ? 30 : uniform();
      for (const filter of [wide, narrow]) {
        predict(filter, gap, walks);
        expectArrival(filter, row);
        absorbArrival(filter, value, 1e-6);
      }
      squares += wide.innovations[0]! ** 2 / wide.innovationVariance;
    }
    const p = matrix(wide);
    const q = matrix(narrow);
    for (let i = 0; i < 5; i++) {
      expect(p[i * 5 + i]).toBeGreaterThan(0);
      for (let j = 0; j < 5; j++) {
        expect(p[i * 5 + j]).toBe(p[j * 5 + i]);
        const scale = Math.sqrt(p[i * 5 + i]! * p[j * 5 + j]!);
        expect(Math.abs(p[i * 5 + j]! - q[i * 5 + j]!) / scale).toBeLessThan(1e-8);
        expect(Math.abs(p[i * 5 + j]!)).toBeLessThanOrEqual(scale * (1 + 1e-12));
      }
    }
    // White data in a model that allows walks: innovations cannot scatter more than stated.
    expect(squares / steps).toBeLessThan(1.01);
    expect(squares / steps).toBeGreaterThan(0.5);
  });
});

/** Runs all arrivals through; returns −½ Σ(e²/S + ln S). */
function run(filter: WhiteningFilter, { days, variances, walks, statics, y }: Case): number {
  const row = new Float64Array(filter.size);
  let sum = 0;
  days.forEach((day, i) => {
    predict(filter, i === 0 ? 0 : day - days[i - 1]!, walks);
    row.set([1, 0, 0, ...statics[i]!]);
    expectArrival(filter, row);
    absorbArrival(filter, [y[i]!], variances[i]!);
    sum -= 0.5 * (filter.innovations[0]! ** 2 / filter.innovationVariance + Math.log(filter.innovationVariance));
  });
  return sum;
}

function matrix(filter: WhiteningFilter): number[] {
  return Array.from({ length: filter.size ** 2 }, (_, k) =>
    covariance(filter, Math.floor(k / filter.size), k % filter.size),
  );
}
