import fc from 'fast-check';
import { linearRegression } from 'simple-statistics';
import { describe, expect, it } from 'vitest';
import { choleskyFactor, logDeterminant, solveLower, solveLowerTransposed } from '../../../detectors/math/cholesky.ts';
import { leastSquares } from '../../../detectors/math/orthogonalBasis.ts';
import { minimise } from '../../../detectors/math/quasiNewton.ts';
import { dice } from '../../support/simulatedPulsar.ts';

function hilbert(n: number): Float64Array {
  return Float64Array.from({ length: n * n }, (_, k) => 1 / (Math.floor(k / n) + (k % n) + 1));
}

describe('Cholesky factor', () => {
  it('has the published determinant of the 5×5 Hilbert matrix, 1/266716800000', () => {
    // Known in closed form (Hilbert 1894).
    const a = hilbert(5);
    expect(choleskyFactor(a, 5)).toBe(5);
    expect(Math.exp(logDeterminant(a, 5)) * 266716800000).toBeCloseTo(1, 9);
  });

  it('solves: L Lᵀ x = b', () => {
    fc.assert(
      fc.property(fc.integer({ min: 1, max: 8 }), fc.integer(), (n, seed) => {
        const { normal } = dice(seed);
        const m = Float64Array.from({ length: n * n }, normal);
        const a = new Float64Array(n * n);
        for (let i = 0; i < n; i++) {
          for (let j = 0; j < n; j++) {
            for (let k = 0; k < n; k++) a[i * n + j]! += m[i * n + k]! * m[j * n + k]!;
          }
          a[i * n + i]! += 0.1;
        }
        const x = Float64Array.from({ length: n }, normal);
        const b = Float64Array.from(x, (_, i) => x.reduce((sum, value, j) => sum + a[i * n + j]! * value, 0));
        expect(choleskyFactor(a, n)).toBe(n);
        solveLower(a, n, b);
        solveLowerTransposed(a, n, b);
        for (let i = 0; i < n; i++) expect(b[i]).toBeCloseTo(x[i]!, 8);
      }),
      { seed: 2 },
    );
  });

  it('counts the rank of a matrix with a dependent row', () => {
    const a = Float64Array.of(4, 2, 8, 2, 5, 4, 8, 4, 16);
    expect(choleskyFactor(a, 3)).toBe(2);
    const b = Float64Array.of(1, 1, 2);
    solveLower(a, 3, b);
    solveLowerTransposed(a, 3, b);
    expect(b[2]).toBe(0);
    expect(b.every(Number.isFinite)).toBe(true);
  });
});

describe('least squares by reflections', () => {
  it('agrees with the straight line of simple-statistics', () => {
    const { normal } = dice(3);
    const points = Array.from({ length: 40 }, (_, i) => [i, 3 - 0.2 * i + normal()]);
    const line = linearRegression(points);
    const fit = leastSquares(
      [new Float64Array(40).fill(1), Float64Array.from(points, ([x]) => x!)],
      Float64Array.from(points, ([, y]) => y!),
    );
    expect(fit.solution[0]).toBeCloseTo(line.b, 12);
    expect(fit.solution[1]).toBeCloseTo(line.m, 12);
    expect(fit.rank).toBe(2);
  });

  it('has residuals orthogonal to every column, and the covariance (XᵀX)⁻¹', () => {
    const { normal } = dice(4);
    const columns = Array.from({ length: 4 }, () => Float64Array.from({ length: 25 }, normal));
    const y = Float64Array.from({ length: 25 }, normal);
    const fit = leastSquares(columns, y);
    const residual = y.map((value, i) => value - columns.reduce((sum, c, j) => sum + c[i]! * fit.solution[j]!, 0));
    for (const column of columns) {
      expect(Math.abs(residual.reduce((sum, r, i) => sum + r * column[i]!, 0))).toBeLessThan(1e-13);
    }
    expect(fit.residualSumOfSquares).toBeCloseTo(
      residual.reduce((sum, r) => sum + r * r, 0),
      12,
    );
    for (let a = 0; a < 4; a++) {
      for (let b = 0; b < 4; b++) {
        let entry = 0;
        for (let k = 0; k < 4; k++) {
          entry += fit.covariance[a * 4 + k]! * columns[k]!.reduce((sum, x, i) => sum + x * columns[b]![i]!, 0);
        }
        expect(entry).toBeCloseTo(a === b ? 1 : 0, 12);
      }
    }
  });

  it('leaves out a column that depends on others', () => {
    const one = new Float64Array(6).fill(1);
    const ramp = Float64Array.of(0, 1, 2, 3, 4, 5);
    const both = ramp.map((x) => 3 * x - 7);
    const y = Float64Array.of(1, 3, 5, 7, 9, 11);
    const fit = leastSquares([one, ramp, both], y);
    expect(fit.rank).toBe(2);
    expect(Array.from(fit.solution)).toEqual([expect.closeTo(1, 12), expect.closeTo(2, 12), 0]);
    expect(fit.residualSumOfSquares).toBeLessThan(1e-20);
  });
});

describe('descent', () => {
  const settings = { differenceStep: 1e-8, longestStep: 1, tolerance: 1e-14, maxSteps: 100 };

  it('finds the minimum of Rosenbrock’s valley (Rosenbrock 1960, Computer J. 3, 175) at (1, 1)', () => {
    const valley = ([x, y]: Float64Array): number => 100 * (y! - x! * x!) ** 2 + (1 - x!) ** 2;
    const { point, value } = minimise(valley, [-1.2, 1], settings);
    expect(point[0]).toBeCloseTo(1, 4);
    expect(point[1]).toBeCloseTo(1, 4);
    expect(value).toBeLessThan(1e-8);
  });

  it('needs few steps in a bowl, and stops at its limit', () => {
    const bowl = (point: Float64Array): number => point.reduce((sum, x, i) => sum + (i + 1) * (x - i) ** 2, 0);
    const { point } = minimise(bowl, [5, -3, 2, 0], { ...settings, maxSteps: 25 });
    point.forEach((x, i) => {
      expect(x).toBeCloseTo(i, 5);
    });
    expect(minimise(bowl, [5, -3, 2, 0], { ...settings, maxSteps: 1 }).evaluations).toBeLessThan(30);
  });

  it('never ends above where it began', () => {
    const { value } = minimise(([x]) => Math.abs(x! - 0.3) + Math.sin(9 * x!), [4], settings);
    expect(value).toBeLessThan(Math.abs(4 - 0.3) + Math.sin(36));
  });
});
