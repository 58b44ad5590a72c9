import type { LeapSecondTable } from '../../../detectors/time/leapSeconds.ts';
import { quoted } from '../../visibleText.ts';
import { type Decimal, decimalOf, isBetween, product, sum } from '../decimal.ts';
import { isPlainDecimal } from '../numbers.ts';
import type { RestUnit, Source, TimeColumns } from './textColumns.ts';
import { mjdOfIso8601, mjdOfJulianDate, mjdOfSeconds, mjdText } from './timeText.ts';

interface TimeContext {
  readonly leapSeconds: LeapSecondTable;
  readonly exponentLetters: string;
}

interface Reason {
  readonly reason: string;
}

/** The date of a row as the digits of a Modified Julian Date; empty where the row has none. */
export function timeOfColumns(
  time: TimeColumns,
  textAt: (source: Source) => string,
  context: TimeContext,
): string | Reason {
  const text = textAt(time.source);
  if (text === '') return '';
  const length = { scale: time.scale, leapSeconds: context.leapSeconds };
  if (time.format === 'iso8601') {
    const whole = time.rest === null ? text : `${text}T${textAt(time.rest.source)}`;
    return mjdOfIso8601(whole, length) ?? { reason: `${quoted(whole)} is not a date such as 2026-03-29T04:05:06.789` };
  }
  const date = time.format === 'jd' ? mjdOfJulianDate(text, context.exponentLetters) : plainDate(text, context);
  if (date === null) return { reason: `${quoted(text)} is not a date in digits` };
  if (time.rest === null) return date;
  const restText = textAt(time.rest.source);
  const rest = decimalOf(restText, context);
  if (rest === null) return { reason: `with the rest ${quoted(restText)}: that is not a number` };
  if (time.rest.unit === 'd') {
    if (!isBetween(rest, -1n, 1n))
      return { reason: `with the rest ${quoted(restText)}: it must be between -1 and 1 days` };
    return mjdText(sum(decimalOf(date)!, rest));
  }
  if (!/^[0-9]{1,7}(?:\.0*)?$/.test(date))
    return { reason: `${quoted(text)} is not a whole day, to which a time of day is added` };
  const seconds = product(rest, SECONDS_IN[time.rest.unit]);
  const dated = mjdOfSeconds(Number(date), seconds, length);
  return dated ?? { reason: `with the rest ${quoted(restText)}: that lies outside the day` };
}

/** `clock` is read with a date in ISO 8601 only. */
const SECONDS_IN: Readonly<Record<Exclude<RestUnit, 'd'>, Decimal>> = {
  s: { digits: 1n, exponent: 0 },
  ms: { digits: 1n, exponent: -3 },
  us: { digits: 1n, exponent: -6 },
  ns: { digits: 1n, exponent: -9 },
  clock: { digits: 1n, exponent: 0 },
};

/** Plain digits as they stand; other writings of a number spelled out. */
function plainDate(text: string, context: TimeContext): string | null {
  if (isPlainDecimal(text)) return text;
  const date = decimalOf(text, context);
  return date === null ? null : mjdText(date);
}
