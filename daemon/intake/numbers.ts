/**
 * The numbers of an arrival file: an optional sign, digits, an optional fraction with digits, an optional exponent, and
 * nothing else. JavaScript's own reading takes blanks for zero, hexadecimal for decimal and 1e400 for infinity.
 */
const DECIMAL = /^[+-]?[0-9]+(?:\.[0-9]+)?(?:[eE][+-]?[0-9]+)?$/;
const WHOLE = /^[+-]?[0-9]+$/;
const PLAIN = /^[0-9]+(?:\.[0-9]+)?$/;

/** Long enough for any measured quantity; a longer one is not a number but a fault. */
const LONGEST = 100;

/** Null for anything else than a decimal number within the range of a double. */
export function parseDecimal(text: string): number | null {
  if (text.length > LONGEST || !DECIMAL.test(text)) return null;
  const value = Number(text);
  return Number.isFinite(value) ? value : null;
}

/** Null for anything else than a whole number that a double holds exactly. */
export function parseWhole(text: string): number | null {
  if (text.length > LONGEST || !WHOLE.test(text)) return null;
  const value = Number(text);
  return Number.isSafeInteger(value) ? value + 0 : null;
}

/** A date: digits with an optional fraction; no sign, no exponent. */
export function isPlainDecimal(text: string): boolean {
  return text.length <= LONGEST && PLAIN.test(text);
}
