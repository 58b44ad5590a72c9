import { leastSquares } from './orthogonalBasis.ts';

/** A weighted polynomial through points: its value, and its derivatives at the mean of x with 1σ uncertainties from the stated weights. */
export interface PolynomialFit {
  readonly valueAt: (x: number) => number;
  readonly slope: number;
  readonly slopeSigma: number;
  /** Second derivative; 0 below degree 2. */
  readonly curvature: number;
  readonly curvatureSigma: number;
}

/** Least squares in powers of (x − centre), rows divided by sigma. Needs more points than `degree`. */
export function fitPolynomial(
  x: readonly number[],
  y: readonly number[],
  sigma: readonly number[],
  degree: number,
): PolynomialFit {
  const centre = x.reduce((a, b) => a + b, 0) / x.length;
  const reach = Math.max(...x.map((v) => Math.abs(v - centre)), Number.MIN_VALUE);
  const columns = Array.from({ length: degree + 1 }, (_, power) =>
    Float64Array.from(x, (v, i) => ((v - centre) / reach) ** power / sigma[i]!),
  );
  const { solution, covariance } = leastSquares(
    columns,
    Float64Array.from(y, (v, i) => v / sigma[i]!),
  );
  const size = degree + 1;
  return {
    valueAt: (at) => {
      const u = (at - centre) / reach;
      let value = 0;
      for (let power = degree; power >= 0; power--) value = value * u + solution[power]!;
      return value;
    },
    slope: degree > 0 ? solution[1]! / reach : 0,
    slopeSigma: degree > 0 ? Math.sqrt(covariance[size + 1]!) / reach : 0,
    curvature: degree > 1 ? (2 * solution[2]!) / reach ** 2 : 0,
    curvatureSigma: degree > 1 ? (2 * Math.sqrt(covariance[2 * size + 2]!)) / reach ** 2 : 0,
  };
}
