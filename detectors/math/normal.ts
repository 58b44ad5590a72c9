/** The normal distribution's tails, right to about 1e-13 relative even far out, where a false-alarm budget lives. */

const SQRT_2 = Math.SQRT2;
const LN_SQRT_2PI = 0.5 * Math.log(2 * Math.PI);
/** Below it the series of erf loses no digits that matter to 1 − erf; above it the continued fraction is short. */
const SERIES_LIMIT = 2;

/** 2/√π ∫ₓ^∞ exp(−t²) dt. */
export function erfc(x: number): number {
  if (x < 0) return 2 - erfc(-x);
  return x < SERIES_LIMIT ? 1 - erfSeries(x) : (Math.exp(-x * x) / Math.sqrt(Math.PI)) * scaledFraction(x);
}

/** P(Z > z) of a standard normal variable. */
export function normalTail(z: number): number {
  return 0.5 * erfc(z / SQRT_2);
}

/** ln P(Z > z), finite for any finite z. */
export function logNormalTail(z: number): number {
  const x = z / SQRT_2;
  if (x < SERIES_LIMIT) return z < -1 ? Math.log1p(-normalTail(-z)) : Math.log(normalTail(z));
  return -x * x + Math.log(scaledFraction(x) / (2 * Math.sqrt(Math.PI)));
}

/** ln of the normal density with the given variance at `deviation` from its mean. */
export function logNormalDensity(deviation: number, variance: number): number {
  return -0.5 * ((deviation * deviation) / variance + Math.log(2 * Math.PI * variance));
}

/**
 * z with P(Z < z) = `probability`; ±Infinity at 0 and 1. Newton's method on the logarithm of the tail, whose concavity
 * makes it converge from the start value of Abramowitz & Stegun 26.2.23.
 */
export function normalQuantile(probability: number): number {
  if (!(probability >= 0 && probability <= 1)) return Number.NaN;
  return probability < 0.5 ? -upperQuantile(probability) : upperQuantile(1 - probability);
}

/** z with P(Z > z) = `tail`, for tails too small to be written as 1 − p. */
export function normalTailQuantile(tail: number): number {
  if (!(tail >= 0 && tail <= 1)) return Number.NaN;
  return tail <= 0.5 ? upperQuantile(tail) : -upperQuantile(1 - tail);
}

function upperQuantile(tail: number): number {
  if (tail === 0) return Number.POSITIVE_INFINITY;
  if (tail === 0.5) return 0;
  const lnTail = Math.log(tail);
  const t = Math.sqrt(-2 * lnTail);
  let z = t - (2.515517 + t * (0.802853 + t * 0.010328)) / (1 + t * (1.432788 + t * (0.189269 + t * 0.001308)));
  for (let i = 0; i < 4; i++) {
    const lnQ = logNormalTail(z);
    const hazard = Math.exp(-0.5 * z * z - LN_SQRT_2PI - lnQ);
    z += (lnQ - lnTail) / hazard;
  }
  return z;
}

/** erf(x) = 2/√π e^(−x²) Σ 2ⁿ x^(2n+1)/(2n+1)!! (Abramowitz & Stegun 7.1.6): all terms positive. */
function erfSeries(x: number): number {
  let term = x;
  let sum = x;
  for (let n = 1; term > 1e-17 * sum; n++) {
    term *= (2 * x * x) / (2 * n + 1);
    sum += term;
  }
  return ((2 * Math.exp(-x * x)) / Math.sqrt(Math.PI)) * sum;
}

/** √π e^(x²) erfc(x) by its continued fraction (Abramowitz & Stegun 7.1.14), evaluated from a depth that suffices. */
function scaledFraction(x: number): number {
  let depth = Math.ceil(8 + 180 / (x * x));
  let value = x;
  for (; depth > 0; depth--) value = x + (0.5 * depth) / value;
  return 1 / value;
}
