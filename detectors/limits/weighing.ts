/**
 * The detector's two weighings of a step, as functions of its size. A step of Δ turns/day shifts every whitened sum
 * linearly, so each log weight is a parabola in Δ, one for each draw of the noise.
 */

import { OUTLIER_SHARE } from '../steps/beam.ts';
import { SIGNATURES, type Sums } from './rehearsal.ts';
import type { SizePrior } from './sizePriors.ts';

/** a + bΔ + cΔ², by draw. */
export interface Parabolas {
  readonly a: number[];
  readonly b: number[];
  readonly c: number[];
}

/** By draw: days from the true epoch to the end of its gap. */
export type Lags = Float64Array;

/** Value at Δ for draw m. */
export function at({ a, b, c }: Parabolas, m: number, delta: number): number {
  return a[m]! + delta * (b[m]! + delta * c[m]!);
}

function parabolas(draws: number): Parabolas {
  const empty = () => new Array<number>(draws).fill(0);
  return { a: empty(), b: empty(), c: empty() };
}

/** ln P(arrivals | nothing new), up to a constant. */
export function nothing(sums: Sums, lags: Lags): Parabolas {
  const { logVariance, squares, own, projections } = sums;
  const out = parabolas(squares.length);
  const [i00, i01, i11] = [own[0]![0]!, own[0]![1]!, own[0]![4]!];
  for (let m = 0; m < squares.length; m++) {
    const lag = lags[m]!;
    out.a[m] = -0.5 * (logVariance + squares[m]!);
    out.b[m] = -(lag * projections[0]![m]! + projections[1]![m]!);
    out.c[m] = -0.5 * (lag * lag * i00 + 2 * lag * i01 + i11);
  }
  return out;
}

/**
 * Setting aside all arrivals of after the look `from` instead of believing them, relative to `nothing`, which
 * is given at both looks: an outlier is anywhere
 * in the turn. So a null that is far off pays a fixed price for each arrival and no more.
 */
export function setAside(from: Sums, to: Sums, [before, after]: readonly [Parabolas, Parabolas]): Parabolas {
  const arrivals = to.arrivals - from.arrivals;
  const price = arrivals * (Math.log(OUTLIER_SHARE / (1 - OUTLIER_SHARE)) + 0.5 * Math.log(2 * Math.PI));
  const less = (a: readonly number[], b: readonly number[], plus: number) => a.map((value, m) => value - b[m]! + plus);
  return { a: less(before.a, after.a, price), b: less(before.b, after.b, 0), c: less(before.c, after.c, 0) };
}

/**
 * ln of the Bayes factor times the prior of a step in gap `g`: ½ dᵀ M d − ½ ln|I + C B| with M = B (I + C B)⁻¹, for a
 * Gaussian prior B of the size (Willsky & Jones 1976). B may be singular: a clock step moves the phase alone.
 */
export function something(sums: Sums, g: number, prior: SizePrior, lags: Lags): Parabolas {
  const { own, cross, projections } = sums;
  const { matrix: m33, logDeterminant } = shrunk(own[g]!, prior.covariance);
  const draws = lags.length;
  const out = parabolas(draws);
  const c = cross[g]!;
  const base = prior.logWeight - 0.5 * logDeterminant;
  // M, the cross information and the projections in scalars: everything spends its time here.
  const [m00, m01, m02, , m11, m12, , , m22] = m33;
  const [p0, p1, p2] = [0, 1, 2].map((a) => projections[SIGNATURES * g + a]!);
  for (let m = 0; m < draws; m++) {
    const lag = lags[m]!;
    const [d0, d1, d2] = [p0![m]!, p1![m]!, p2![m]!];
    const u0 = lag * c[0]! + c[1]!;
    const u1 = lag * c[3]! + c[4]!;
    const u2 = lag * c[6]! + c[7]!;
    const mu0 = m00! * u0 + m01! * u1 + m02! * u2;
    const mu1 = m01! * u0 + m11! * u1 + m12! * u2;
    const mu2 = m02! * u0 + m12! * u1 + m22! * u2;
    const dd =
      m00! * d0 * d0 + m11! * d1 * d1 + m22! * d2 * d2 + 2 * (m01! * d0 * d1 + m02! * d0 * d2 + m12! * d1 * d2);
    out.a[m] = base + 0.5 * dd;
    out.b[m] = d0 * mu0 + d1 * mu1 + d2 * mu2;
    out.c[m] = 0.5 * (u0 * mu0 + u1 * mu1 + u2 * mu2);
  }
  return out;
}

/** B (I + C B)⁻¹ and ln|I + C B|, 3×3. */
function shrunk(
  information: ArrayLike<number>,
  covariance: ArrayLike<number>,
): { readonly matrix: readonly number[]; readonly logDeterminant: number } {
  const k = product(information, covariance);
  for (let i = 0; i < SIGNATURES; i++) k[4 * i]! += 1;
  const { inverse, determinant } = inverted(k);
  return { matrix: product(covariance, inverse), logDeterminant: Math.log(Math.max(determinant, 1)) };
}

function product(a: ArrayLike<number>, b: ArrayLike<number>): number[] {
  const out = new Array<number>(9);
  for (let i = 0; i < 3; i++)
    for (let j = 0; j < 3; j++)
      out[3 * i + j] = a[3 * i]! * b[j]! + a[3 * i + 1]! * b[3 + j]! + a[3 * i + 2]! * b[6 + j]!;
  return out;
}

/** By cofactors. */
function inverted(m: readonly number[]): { readonly inverse: number[]; readonly determinant: number } {
  const [a, b, c, d, e, f, g, h, i] = m as [number, number, number, number, number, number, number, number, number];
  const [ei, fg, dh] = [e * i - f * h, f * g - d * i, d * h - e * g];
  const determinant = a * ei + b * fg + c * dh;
  const scale = 1 / determinant;
  const inverse = [
    ei,
    c * h - b * i,
    b * f - c * e,
    fg,
    a * i - c * g,
    c * d - a * f,
    dh,
    b * g - a * h,
    a * e - b * d,
  ];
  for (let n = 0; n < inverse.length; n++) inverse[n]! *= scale;
  return { inverse, determinant };
}

/** ln Σ exp over parabolas at Δ for draw m. */
export function total(terms: readonly Parabolas[], m: number, delta: number): number {
  let highest = -Infinity;
  for (const term of terms) highest = Math.max(highest, at(term, m, delta));
  if (highest === -Infinity) return highest;
  let sum = 0;
  for (const term of terms) {
    const below = at(term, m, delta) - highest;
    if (below > -30) sum += Math.exp(below);
  }
  return highest + Math.log(sum);
}
