/** Log-gamma and the regularised incomplete gamma functions; with them the chi-square tail. Good to about 1e-13. */

const HALF_LN_2PI = 0.5 * Math.log(2 * Math.PI);
const STIRLING_FROM = 15;

/** B₂ₖ / (2k (2k − 1)), k = 1…8 (Abramowitz & Stegun 6.1.40). */
const STIRLING = [1 / 12, -1 / 360, 1 / 1260, -1 / 1680, 1 / 1188, -691 / 360360, 1 / 156, -3617 / 122400] as const;

/** ln Γ(x) for x > 0; NaN otherwise. */
export function logGamma(x: number): number {
  if (!(x > 0)) return Number.NaN;
  let shifted = x;
  let product = 1;
  while (shifted < STIRLING_FROM) {
    product *= shifted;
    shifted += 1;
  }
  return (shifted - 0.5) * Math.log(shifted) - shifted + HALF_LN_2PI + stirlingRest(shifted) - Math.log(product);
}

/** What Stirling's formula leaves out of ln Γ(x), for x ≥ 15. */
function stirlingRest(x: number): number {
  const inverseSquare = 1 / (x * x);
  let sum = 0;
  for (let k = STIRLING.length - 1; k >= 0; k--) sum = sum * inverseSquare + STIRLING[k]!;
  return sum / x;
}

/** P(a, x) = γ(a, x)/Γ(a), for a > 0, x ≥ 0. */
export function regularisedGammaP(a: number, x: number): number {
  if (!(a > 0 && x >= 0)) return Number.NaN;
  if (x === 0) return 0;
  return x < a + 1 ? series(a, x) : 1 - continuedFraction(a, x);
}

/** Q(a, x) = 1 − P(a, x), with full relative accuracy in the far tail. */
export function regularisedGammaQ(a: number, x: number): number {
  if (!(a > 0 && x >= 0)) return Number.NaN;
  if (x === 0) return 1;
  return x < a + 1 ? 1 - series(a, x) : continuedFraction(a, x);
}

/** P(χ² > `value`) with the given degrees of freedom. */
export function chiSquareTail(value: number, degreesOfFreedom: number): number {
  return value <= 0 ? 1 : regularisedGammaQ(0.5 * degreesOfFreedom, 0.5 * value);
}

/** xᵃ e⁻ˣ / Γ(a); for large a by way of x/a, so that no large logarithms are subtracted. */
function weight(a: number, x: number): number {
  if (a < STIRLING_FROM) return Math.exp(a * Math.log(x) - x - logGamma(a));
  const excess = (x - a) / a;
  const exponent = Math.abs(excess) < 0.5 ? a * (excess - Math.log1p(excess)) : x - a - a * Math.log(x / a);
  return Math.sqrt(a / (2 * Math.PI)) * Math.exp(-exponent - stirlingRest(a));
}

/** Abramowitz & Stegun 6.5.29. */
function series(a: number, x: number): number {
  let term = 1 / a;
  let sum = term;
  for (let n = 1; term > 1e-17 * sum; n++) {
    term *= x / (a + n);
    sum += term;
  }
  return sum * weight(a, x);
}

/** Abramowitz & Stegun 6.5.31, by Lentz's method. */
function continuedFraction(a: number, x: number): number {
  const tiny = 1e-300;
  let b = x + 1 - a;
  let c = 1 / tiny;
  let d = 1 / b;
  let h = d;
  for (let n = 1; n < 10_000; n++) {
    const an = -n * (n - a);
    b += 2;
    d = an * d + b;
    d = 1 / (Math.abs(d) < tiny ? tiny : d);
    c = b + an / c;
    if (Math.abs(c) < tiny) c = tiny;
    const factor = c * d;
    h *= factor;
    if (Math.abs(factor - 1) < 1e-16) break;
  }
  return h * weight(a, x);
}
