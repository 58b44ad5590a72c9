/** Decimal numbers kept digit by digit, so that a change of unit or a shift of the day's start costs none of them. */
export interface Decimal {
  readonly digits: bigint;
  /** The value is digits × 10^exponent. */
  readonly exponent: number;
}

/** As Fortran and C write numbers: a bare point at either end is allowed. */
const WRITTEN = /^([+-]?)(?:([0-9]+)(?:\.([0-9]*))?|\.([0-9]+))(?:([A-Za-z])([+-]?[0-9]+))?$/;
const LONGEST = 100;
/** Beyond the range of a double, at either end. */
const LARGEST_EXPONENT = 1000;

/** Null for what is no number, or one beyond 10^±1000. `exponentLetters`: the letters that may begin an exponent. */
export function decimalOf(text: string, { exponentLetters = 'eE' } = {}): Decimal | null {
  if (text.length > LONGEST) return null;
  const match = WRITTEN.exec(text);
  if (match === null) return null;
  const [, sign, whole = '', fraction = '', bareFraction = '', letter, power] = match;
  if (letter !== undefined && !exponentLetters.includes(letter)) return null;
  const behindPoint = fraction + bareFraction;
  const exponent = Number(power ?? '0') - behindPoint.length;
  if (Math.abs(exponent) > LARGEST_EXPONENT) return null;
  const digits = BigInt(whole + behindPoint);
  return { digits: sign === '-' ? -digits : digits, exponent };
}

export function product(a: Decimal, b: Decimal): Decimal {
  return { digits: a.digits * b.digits, exponent: a.exponent + b.exponent };
}

export function sum(a: Decimal, b: Decimal): Decimal {
  const exponent = Math.min(a.exponent, b.exponent);
  return { digits: digitsAt(a, exponent) + digitsAt(b, exponent), exponent };
}

/** Rounded to the nearest multiple of 10^−decimals, halves away from zero. */
export function quotient(a: Decimal, divisor: bigint, decimals: number): Decimal {
  const shift = a.exponent + decimals;
  const [over, under] =
    shift >= 0 ? [a.digits * 10n ** BigInt(shift), divisor] : [a.digits, divisor * 10n ** BigInt(-shift)];
  const half = over < 0n ? -under : under;
  return { digits: (2n * over + half) / (2n * under), exponent: -decimals };
}

export function isBetween(value: Decimal, low: bigint, high: bigint): boolean {
  const exponent = Math.min(value.exponent, 0);
  const digits = digitsAt(value, exponent);
  const one = 10n ** BigInt(-exponent);
  return digits >= low * one && digits <= high * one;
}

function digitsAt({ digits, exponent }: Decimal, smaller: number): bigint {
  return digits * 10n ** BigInt(exponent - smaller);
}

/** Digits and a point, without an exponent. */
export function decimalText({ digits, exponent }: Decimal): string {
  const sign = digits < 0n ? '-' : '';
  const size = `${digits < 0n ? -digits : digits}`;
  if (exponent >= 0) return sign + size + (digits === 0n ? '' : '0'.repeat(exponent));
  const padded = size.padStart(1 - exponent, '0');
  return `${sign}${padded.slice(0, exponent)}.${padded.slice(exponent)}`;
}
