import type { Interval } from '../../detectors/steps/pulsarEvent.ts';

/** Dates with the name of their scale. A civil date beside an MJD is for the calendar: it leaves out the light path (up to 8.3 min) and TDB − UTC (69 s). */

const MJD_OF_UNIX_EPOCH = 40_587;
const DAY_MS = 86_400_000;

/** `MJD 60123.41 +0.39 −0.31 (TDB)`. */
export function epochText(mjd: number, interval68: Interval): string {
  const up = Math.max(0, interval68[1] - mjd);
  const down = Math.max(0, mjd - interval68[0]);
  const decimals = decimalsOfDays(Math.max(up, down));
  const shown = mjd.toFixed(decimals);
  if (up + down === 0) return `MJD ${shown} (TDB)`;
  if (Math.abs(up - down) <= 0.15 * Math.max(up, down))
    return `MJD ${shown} ± ${((up + down) / 2).toFixed(decimals)} (TDB)`;
  return `MJD ${shown} +${up.toFixed(decimals)} −${down.toFixed(decimals)} (TDB)`;
}

export function mjdText(mjd: number): string {
  return `MJD ${mjd.toFixed(2)}`;
}

/** `28 June 2023, about 10 h UTC (12 h Europe/Berlin)`, or the day or days alone when the epoch is no better known. */
export function civilEpoch(mjd: number, interval68: Interval, timezone: string): string {
  const [low, high] = interval68.map(dateOfMjd) as [Date, Date];
  const from = dayText(low, 'UTC');
  const to = dayText(high, 'UTC');
  const width = interval68[1] - interval68[0];
  if (width >= 0.5) return from === to ? `${from} UTC` : `${from} to ${to} UTC`;
  const at = dateOfMjd(mjd);
  return timezone === 'UTC'
    ? `${dayText(at, 'UTC')}, about ${clock(at, 'UTC')} UTC`
    : `${dayText(at, 'UTC')}, about ${clock(at, 'UTC')} UTC (${localTime(at, timezone)})`;
}

/** A moment of the daemon's own clock: `2023-06-28 11:50 Europe/Berlin (09:50 UTC)`. */
export function momentText(at: Date, timezone: string): string {
  const local = `${isoDay(at, timezone)} ${clock(at, timezone)} ${timezone}`;
  return timezone === 'UTC' ? local : `${local} (${clock(at, 'UTC')} UTC)`;
}

/** `2023-06-28` in the zone. */
export function isoDay(at: Date, timezone: string): string {
  const p = parts(at, timezone, { year: 'numeric', month: '2-digit', day: '2-digit' });
  return `${p('year')}-${p('month')}-${p('day')}`;
}

export function dateOfMjd(mjd: number): Date {
  return new Date(Math.round((mjd - MJD_OF_UNIX_EPOCH) * DAY_MS));
}

/** `28 June 2023`. */
export function dayText(at: Date, timezone: string): string {
  const p = parts(at, timezone, { year: 'numeric', month: 'long', day: 'numeric' });
  return `${p('day')} ${p('month')} ${p('year')}`;
}

function localTime(at: Date, timezone: string): string {
  const sameDay = isoDay(at, timezone) === isoDay(at, 'UTC');
  return `${sameDay ? '' : `${dayText(at, timezone)}, `}${clock(at, timezone)} ${timezone}`;
}

function clock(at: Date, timezone: string): string {
  const p = parts(at, timezone, { hour: '2-digit', minute: '2-digit', hourCycle: 'h23' });
  return `${p('hour')}:${p('minute')}`;
}

function parts(
  at: Date,
  timezone: string,
  format: Intl.DateTimeFormatOptions,
): (type: Intl.DateTimeFormatPartTypes) => string {
  const all = new Intl.DateTimeFormat('en-GB', { ...format, timeZone: timezone }).formatToParts(at);
  return (type) => all.find((p) => p.type === type)?.value ?? '';
}

function decimalsOfDays(uncertainty: number): number {
  if (!(uncertainty > 0)) return 2;
  return Math.max(1, Math.min(5, 1 - Math.floor(Math.log10(uncertainty))));
}

/** Whole minutes below an hour, hours below two days, then days; rounded down, so that no silence is made longer than it is. */
export function timeInWords(hours: number): string {
  // A nudge against 0.9999…: 20 minutes are a third of an hour.
  const whole = (value: number) => Math.floor(value + 1e-6);
  if (hours < 1) return whole(hours * 60) === 1 ? '1 minute' : `${whole(hours * 60)} minutes`;
  if (hours < 48) return hours < 10 && !Number.isInteger(hours) ? `${whole(hours * 10) / 10} h` : `${whole(hours)} h`;
  return `${whole(hours / 24)} days`;
}
