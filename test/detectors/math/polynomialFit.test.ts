import { describe, expect, test } from 'vitest';
import { fitPolynomial } from '../../../detectors/math/polynomialFit.ts';

describe('a polynomial through points', () => {
  const x = Array.from({ length: 9 }, (_, i) => 60_000 + 3 * i);
  const sigma = x.map(() => 0.02);

  test('gives back the derivatives of a parabola', () => {
    const fit = fitPolynomial(
      x,
      x.map((v) => 1.5 - 0.25 * (v - 60_012) + 0.004 * (v - 60_012) ** 2),
      sigma,
      2,
    );
    expect(fit.slope).toBeCloseTo(-0.25, 10);
    expect(fit.curvature).toBeCloseTo(0.008, 12);
    expect(fit.valueAt(60_012)).toBeCloseTo(1.5, 10);
  });

  // Orthogonal polynomials on N equally spaced points d apart: var(c₁) = 12 σ²/(N(N²−1) d²), var(c₂) = 180 σ²/(N(N²−1)(N²−4) d⁴)
  // (textbooks on orthogonal polynomials in regression, from memory). The second derivative is 2 c₂.
  test('states the uncertainties that equal spacing gives in closed form', () => {
    const fit = fitPolynomial(x, x, sigma, 2);
    const [n, d, s] = [9, 3, 0.02];
    expect(fit.slopeSigma).toBeCloseTo(s * Math.sqrt(12 / (n * (n ** 2 - 1) * d ** 2)), 12);
    expect(fit.curvatureSigma).toBeCloseTo(2 * s * Math.sqrt(180 / (n * (n ** 2 - 1) * (n ** 2 - 4) * d ** 4)), 12);
  });

  test('of a line, no curvature', () => {
    const fit = fitPolynomial(x, x, sigma, 1);
    expect([fit.curvature, fit.curvatureSigma]).toEqual([0, 0]);
  });
});
