import { type LeapSecondTable, utcDayLengthS } from '../../../detectors/time/leapSeconds.ts';
import { type Decimal, decimalOf, decimalText, quotient, sum } from '../decimal.ts';

/** Dates as others write them → the digits of a Modified Julian Date, none lost. */

/** Decimals of a date that is the result of a sum or a division: a hundred-millionth of what a double holds of a day. */
const DECIMALS = 25;
const LONGEST_FRACTION = 40;
const JD_MINUS_MJD: Decimal = { digits: 24_000_005n, exponent: -1 };
const MS_PER_DAY = 86_400_000;
/** 1970-01-01, the day that JavaScript counts from. */
const UNIX_EPOCH_MJD = 40_587;

/** Digits that the reading of dates takes: a longer fraction is rounded, far below its resolution. */
export function mjdText(date: Decimal): string {
  return decimalText(date.exponent < -LONGEST_FRACTION ? quotient(date, 1n, DECIMALS) : date);
}

/** Null for what is no decimal number. */
export function mjdOfJulianDate(text: string, exponentLetters: string): string | null {
  const date = decimalOf(text, { exponentLetters });
  return date === null ? null : mjdText(sum(date, { ...JD_MINUS_MJD, digits: -JD_MINUS_MJD.digits }));
}

export interface DayLength {
  readonly scale: 'UTC' | 'TDB';
  readonly leapSeconds: LeapSecondTable;
}

/**
 * A whole day and seconds since it began. On a UTC day with a leap second the day is a second longer, and its fraction counts
 * parts of that. Null where the seconds lie outside the day.
 */
export function mjdOfSeconds(day: number, seconds: Decimal, { scale, leapSeconds }: DayLength): string | null {
  const lengthS = BigInt(scale === 'UTC' ? utcDayLengthS(leapSeconds, day) : 86_400);
  const left = sum({ digits: lengthS, exponent: 0 }, { ...seconds, digits: -seconds.digits });
  if (seconds.digits < 0n || left.digits <= 0n) return null;
  const fraction = quotient(seconds, lengthS, DECIMALS);
  return decimalText(sum({ digits: BigInt(day), exponent: 0 }, fraction))
    .replace(/0+$/, '')
    .replace(/\.$/, '');
}

const ISO_8601 = /^([0-9]{4})-([0-9]{2})-([0-9]{2})[T ]([0-9]{2}):([0-9]{2}):([0-9]{2}(?:[.,][0-9]{1,30})?)Z?$/;

/** `2026-03-29T04:05:06.789`, with a blank for the T or a Z behind it if need be; null for anything else. */
export function mjdOfIso8601(text: string, length: DayLength): string | null {
  const match = ISO_8601.exec(text);
  if (match === null) return null;
  const [year, month, date, hours, minutes] = match.slice(1, 6).map(Number) as [number, number, number, number, number];
  const midnight = new Date(Date.UTC(year, month - 1, date));
  if (year < 1900 || midnight.getUTCMonth() !== month - 1 || midnight.getUTCDate() !== date) return null;
  const seconds = decimalOf(match[6]!.replace(',', '.'))!;
  if (hours > 23 || minutes > 59 || !fitsMinute(seconds, hours === 23 && minutes === 59)) return null;
  const day = midnight.getTime() / MS_PER_DAY + UNIX_EPOCH_MJD;
  const ofDay = sum({ digits: BigInt(hours * 3600 + minutes * 60), exponent: 0 }, seconds);
  return mjdOfSeconds(day, ofDay, length);
}

/** Only the day's last minute may have a second 60; whether it has one, the day's length tells. */
function fitsMinute(seconds: Decimal, isLast: boolean): boolean {
  const value = Number(decimalText(seconds));
  return value < (isLast ? 61 : 60);
}
