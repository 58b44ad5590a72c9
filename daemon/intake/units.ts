import { type Decimal, decimalOf, decimalText, product } from './decimal.ts';

/** Units of time and frequency as FITS, VOTable and people write them, and how much of our own units each is: exactly. */

const power = (exponent: number): Decimal => ({ digits: 1n, exponent });

/** In µs. */
export const TIME_UNITS: Readonly<Record<string, Decimal>> = {
  d: { digits: 864n, exponent: 8 },
  s: power(6),
  ms: power(3),
  us: power(0),
  µs: power(0),
  μs: power(0),
  ns: power(-3),
};

/** In MHz. */
export const FREQUENCY_UNITS: Readonly<Record<string, Decimal>> = {
  Hz: power(-6),
  kHz: power(-3),
  MHz: power(0),
  GHz: power(3),
};

export function unitIn(units: Readonly<Record<string, Decimal>>, name: string): Decimal | null {
  return Object.hasOwn(units, name) ? units[name]! : null;
}

/**
 * A number in another unit; text that is no number comes back as it is, for the complaint. A number beyond 10^±1000 does too,
 * and fits no quantity in any unit.
 */
export function inUnit(text: string, unit: Decimal): string {
  if (unit.digits === 1n && unit.exponent === 0) return text;
  const value = decimalOf(text);
  return value === null ? text : decimalText(product(value, unit));
}
