import { createTask, parse, validate } from 'node-cron';
import { type CivilTime, civilTime } from '../clock.ts';

/**
 * When the morning digest is due: once per civil date on which the operator's cron expression matches, at the first time of day it
 * names. Comparing what the wall clock shows, and not instants, is what makes it right across daylight-saving changes: a time that
 * the spring change skips is due at the first moment after the gap, and one that the autumn change repeats is due once.
 */
export interface DigestRule {
  readonly zone: string;
  /** The civil date is one of the expression's. */
  matchesDate(date: string): boolean;
  /** `HH:MM:SS`, the first time of day in the expression. */
  readonly time: string;
}

/** Throws an Error that names the expression when it is not a cron expression. */
export function digestRule(cron: string, zone: string): DigestRule {
  if (!validate(cron)) throw new Error(`“${cron}” is not a cron expression (minute hour day month weekday)`);
  const fields = parse(cron);
  const two = (values: readonly number[]) => String(Math.min(...values)).padStart(2, '0');
  const time = `${two(fields.hour)}:${two(fields.minute)}:${two(fields.second)}`;
  // Matching the wall clock's reading as if it were UTC leaves the calendar to the library and the zone to us.
  const calendar = createTask(cron, () => {}, { timezone: 'UTC' });
  return { zone, time, matchesDate: (date) => calendar.match(new Date(`${date}T${time}Z`)) };
}

/** The civil date whose digest is due at `now` and not yet made, or null. Only today's: a digest of days gone by helps nobody. */
export function digestDue(rule: DigestRule, now: Date, wasMade: (date: string) => boolean): string | null {
  const wall: CivilTime = civilTime(now, rule.zone);
  const due = wall.time >= rule.time && rule.matchesDate(wall.date) && !wasMade(wall.date);
  return due ? wall.date : null;
}
