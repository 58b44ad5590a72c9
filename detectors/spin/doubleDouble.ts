import type { DoubleDouble } from './pulsarModel.ts';

/**
 * Numbers as unevaluated sums of two doubles (106 bits), by the error-free transformations of Dekker 1971
 * (Numer. Math. 18, 224) and Knuth (two-sum); renormalised so that hi is the nearest double to the value.
 */

const SPLITTER = 134_217_729; // 2^27 + 1

export const ZERO: DoubleDouble = { hi: 0, lo: 0 };

export function fromNumber(value: number): DoubleDouble {
  return { hi: value, lo: 0 };
}

export function toNumber(value: DoubleDouble): number {
  return value.hi + value.lo;
}

/** Exact a + b. */
export function twoSum(a: number, b: number): DoubleDouble {
  const hi = a + b;
  const bPart = hi - a;
  return { hi, lo: a - (hi - bPart) + (b - bPart) };
}

/** Exact a + b where |a| ≥ |b|. */
function quickTwoSum(a: number, b: number): DoubleDouble {
  const hi = a + b;
  return { hi, lo: b - (hi - a) };
}

/** Exact a × b, for |a|, |b| below 1e290. */
export function twoProduct(a: number, b: number): DoubleDouble {
  const hi = a * b;
  const aSplit = SPLITTER * a;
  const aHigh = aSplit - (aSplit - a);
  const aLow = a - aHigh;
  const bSplit = SPLITTER * b;
  const bHigh = bSplit - (bSplit - b);
  const bLow = b - bHigh;
  return { hi, lo: aHigh * bHigh - hi + aHigh * bLow + aLow * bHigh + aLow * bLow };
}

/** Relative error below 2⁻¹⁰⁴, also under cancellation. */
export function add(a: DoubleDouble, b: DoubleDouble): DoubleDouble {
  const s = twoSum(a.hi, b.hi);
  const t = twoSum(a.lo, b.lo);
  const u = quickTwoSum(s.hi, s.lo + t.hi);
  return quickTwoSum(u.hi, u.lo + t.lo);
}

/** Relative error below 2⁻¹⁰². */
export function multiply(a: DoubleDouble, b: DoubleDouble): DoubleDouble {
  const p = twoProduct(a.hi, b.hi);
  return quickTwoSum(p.hi, p.lo + (a.hi * b.lo + a.lo * b.hi));
}

/** Nearest whole number, halves upward, with the exact rest in [-0.5, 0.5). Whole part exact below 2⁵³. */
export function splitWhole(a: DoubleDouble): { readonly whole: number; readonly rest: number } {
  let whole = Math.round(a.hi);
  let rest = a.hi - whole + a.lo;
  if (rest >= 0.5) {
    whole += 1;
    rest = a.hi - whole + a.lo;
  } else if (rest < -0.5) {
    whole -= 1;
    rest = a.hi - whole + a.lo;
  }
  return { whole, rest };
}

const DECIMAL = /^\s*([+-]?)(\d*)(?:\.(\d*))?(?:[eE]([+-]?\d+))?\s*$/;

/**
 * The value nearest to the decimal text: hi is the double nearest to it, lo the double nearest to the exact remainder.
 * @throws Error that quotes the text when it is not a finite decimal number.
 */
export function parseDoubleDouble(text: string): DoubleDouble {
  const match = DECIMAL.exec(text);
  const digits = match ? `${match[2] ?? ''}${match[3] ?? ''}` : '';
  if (!match || digits === '') throw new Error(`"${text}" is not a decimal number`);
  const hi = Number(text);
  const exponent = Number(match[4] ?? 0) - (match[3] ?? '').length;
  if (!Number.isFinite(hi) || Math.abs(exponent) > 400) throw new Error(`"${text}" is outside the range of numbers`);
  if (hi === 0) return ZERO;
  const sign = match[1] === '-' ? -1n : 1n;
  const value = decimalFraction(sign * BigInt(digits), exponent);
  const leading = binaryFraction(hi);
  const remainder = {
    numerator: value.numerator * leading.denominator - leading.numerator * value.denominator,
    denominator: value.denominator * leading.denominator,
  };
  return { hi, lo: nearestDouble(remainder) };
}

interface Fraction {
  readonly numerator: bigint;
  readonly denominator: bigint;
}

function decimalFraction(digits: bigint, exponent: number): Fraction {
  return exponent >= 0
    ? { numerator: digits * 10n ** BigInt(exponent), denominator: 1n }
    : { numerator: digits, denominator: 10n ** BigInt(-exponent) };
}

/** A finite double as the exact fraction that it is. */
function binaryFraction(value: number): Fraction {
  let mantissa = value;
  let doublings = 0;
  while (!Number.isInteger(mantissa)) {
    mantissa *= 2;
    doublings += 1;
  }
  return { numerator: BigInt(mantissa), denominator: 1n << BigInt(doublings) };
}

/** 106 bits are 31.9 decimal digits; with one more, a text that was read would not come out as it was written. */
const TEXT_DIGITS = 31;

/** The decimal text of a number: `123.4567`, rounded to 31 digits, without an exponent. */
export function formatDoubleDouble(value: DoubleDouble): string {
  const [a, b] = [binaryFraction(value.hi), binaryFraction(value.lo)];
  const numerator = a.numerator * b.denominator + b.numerator * a.denominator;
  const denominator = a.denominator * b.denominator;
  const size = numerator < 0n ? -numerator : numerator;
  if (size === 0n) return '0';
  const decimals = Math.max(0, TEXT_DIGITS - 1 - Math.floor(Math.log10(Math.abs(value.hi))));
  const scaled = (2n * size * 10n ** BigInt(decimals) + denominator) / (2n * denominator);
  const digits = scaled.toString().padStart(decimals + 1, '0');
  const whole = digits.slice(0, digits.length - decimals);
  const rest = digits.slice(digits.length - decimals).replace(/0+$/, '');
  return `${numerator < 0n ? '-' : ''}${whole}${rest === '' ? '' : `.${rest}`}`;
}

/** Correctly rounded by way of a long decimal quotient: Number() of a decimal text rounds exactly. */
function nearestDouble({ numerator, denominator }: Fraction): number {
  if (numerator === 0n) return 0;
  const size = numerator < 0n ? -numerator : numerator;
  const scale = Math.max(0, denominator.toString().length - size.toString().length) + 40;
  const quotient = (size * 10n ** BigInt(scale)) / denominator;
  return (numerator < 0n ? -1 : 1) * Number(`${quotient}e-${scale}`);
}
