/**
 * A date as two parts, so that no digit of an arrival time is lost: one double at MJD 60000 resolves only 0.63 µs.
 * `day` is a whole Modified Julian Date, `fraction` is in [0, 1) of that day (resolution 1e-16 d, 0.01 ns).
 * The time scale is named by whoever holds the value (`tdb`, `utc`).
 */
export interface Mjd {
  readonly day: number;
  readonly fraction: number;
}

export const SECONDS_PER_DAY = 86_400;

/** Days from `b` to `a`; exact to one rounding of the result. Same time scale, no leap seconds. */
export function daysBetween(a: Mjd, b: Mjd): number {
  return a.day - b.day + (a.fraction - b.fraction);
}

/** One double, good to 0.6 µs at present dates: for display, sorting and plots only. */
export function mjdNumber(t: Mjd): number {
  return t.day + t.fraction;
}

/** Brings any day + fraction into the normal form with the fraction in [0, 1). */
export function normalMjd(day: number, fraction: number): Mjd {
  const whole = Math.floor(day);
  let rest = fraction + (day - whole);
  const carry = Math.floor(rest);
  rest -= carry;
  return rest >= 1 ? { day: whole + carry + 1, fraction: 0 } : { day: whole + carry, fraction: rest };
}

export function addSeconds(t: Mjd, seconds: number): Mjd {
  return normalMjd(t.day, t.fraction + seconds / SECONDS_PER_DAY);
}

export function compareMjd(a: Mjd, b: Mjd): number {
  return a.day - b.day || a.fraction - b.fraction;
}

const MJD_TEXT = /^([0-9]{1,7})(?:\.([0-9]{1,40}))?$/;

/**
 * Decimal text → date, without passing the digits through one double. Only `digits` or `digits.digits`: no sign, exponent, blank or
 * separator. Null: not such a number. The fraction is the double nearest to the written digits (within 0.01 ns).
 */
export function parseMjd(text: string): Mjd | null {
  const match = MJD_TEXT.exec(text);
  if (match === null) return null;
  return normalMjd(Number(match[1]), match[2] === undefined ? 0 : Number(`0.${match[2]}`));
}

/** `day.fraction` with at least 16 decimals, which is enough for no fraction to round up to 1; 17 (the default) read back as the same date. */
export function formatMjd(t: Mjd, decimals = 17): string {
  return `${t.day}${t.fraction.toFixed(Math.max(16, decimals)).slice(1)}`;
}
