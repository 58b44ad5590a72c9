import type { Quality } from '../arrival.ts';
import { type LeapSecondTable, taiMinusUtcS, utcDayLengthS } from './leapSeconds.ts';
import { addSeconds, type Mjd, normalMjd, SECONDS_PER_DAY } from './mjd.ts';

/**
 * UTC → TAI → TT and back. (TT → TDB needs the site's place and the Earth's velocity: see sky/observer.ts.)
 *
 * The fraction of a UTC date counts parts of *that* day: on a day with a leap second, parts of 86 401 s, so that every second, the
 * leap second too, has a date of its own (the quasi-Julian date of the IAU SOFA library).
 */

/** TT − TAI, s: IAU 1991 resolution A4, exact. */
export const TT_MINUS_TAI_S = 32.184;

export interface TerrestrialTime {
  readonly tt: Mjd;
  /** UTC day's TAI − UTC, s. */
  readonly taiMinusUtcS: number;
  readonly quality: Quality;
  readonly reason: string;
}

export function utcToTt(utc: Mjd, leapSeconds: LeapSecondTable): TerrestrialTime {
  const offset = taiMinusUtcS(leapSeconds, utc.day);
  const stretch = (utcDayLengthS(leapSeconds, utc.day) - SECONDS_PER_DAY) / SECONDS_PER_DAY;
  const elapsed = utc.fraction + utc.fraction * stretch;
  const tt = normalMjd(utc.day, elapsed + (offset.seconds + TT_MINUS_TAI_S) / SECONDS_PER_DAY);
  return { tt, taiMinusUtcS: offset.seconds, quality: offset.quality, reason: offset.reason };
}

/** The inverse of `utcToTt`, to 0.01 ns. Dates before 1972 come back with no offset taken off: see the quality of `utcToTt`. */
export function ttToUtc(tt: Mjd, leapSeconds: LeapSecondTable): Mjd {
  const tai = addSeconds(tt, -TT_MINUS_TAI_S);
  // TAI is ahead of UTC by less than a day, so the offset of TAI's own day tells on which side of midnight UTC is.
  const day = addSeconds(tai, -taiMinusUtcS(leapSeconds, tai.day).seconds).day;
  const days = daysSinceStart(tai, day, leapSeconds);
  return normalMjd(day, (days * SECONDS_PER_DAY) / utcDayLengthS(leapSeconds, day));
}

/** Days of 86 400 s since the UTC day began. */
function daysSinceStart(tai: Mjd, utcDay: number, leapSeconds: LeapSecondTable): number {
  return tai.day - utcDay + (tai.fraction - taiMinusUtcS(leapSeconds, utcDay).seconds / SECONDS_PER_DAY);
}
