/**
 * Checks the five fields of a crontab line as POSIX lists them (minute, hour, day of month, month, day of week), with the steps
 * and the names of months and weekdays that are common practice. Running it is `daemon/schedule`'s part.
 */

interface Field {
  readonly title: string;
  readonly low: number;
  readonly high: number;
  readonly names: readonly string[];
}

const MONTHS = ['jan', 'feb', 'mar', 'apr', 'may', 'jun', 'jul', 'aug', 'sep', 'oct', 'nov', 'dec'];
const WEEKDAYS = ['sun', 'mon', 'tue', 'wed', 'thu', 'fri', 'sat'];

const FIELDS: readonly Field[] = [
  { title: 'minute', low: 0, high: 59, names: [] },
  { title: 'hour', low: 0, high: 23, names: [] },
  { title: 'day of the month', low: 1, high: 31, names: [] },
  { title: 'month', low: 1, high: 12, names: MONTHS },
  { title: 'day of the week', low: 0, high: 7, names: WEEKDAYS },
];

/** What is wrong with a schedule, in words; null when nothing is. */
export function cronProblem(text: string): string | null {
  const parts = text.trim().split(/ +/);
  if (parts.length !== FIELDS.length) {
    return `must have five fields (minute, hour, day of the month, month, day of the week) such as "0 8 * * *", found ${parts.length}`;
  }
  for (const [index, field] of FIELDS.entries()) {
    const wrong = parts[index]!.split(',').find((item) => !isItem(item, field));
    if (wrong !== undefined)
      return `${field.title} "${wrong}" is not a number from ${field.low} to ${field.high}, a range or a step`;
  }
  return null;
}

/** A star, a number or a range; a star or a range may have a step behind a slash. */
function isItem(item: string, field: Field): boolean {
  const match = /^([^/]+)(?:\/([1-9][0-9]?))?$/.exec(item);
  if (match === null) return false;
  const [, range, step] = match;
  if (range === '*') return true;
  const ends = range!.split('-').map((end) => numberOf(end, field));
  if (ends.includes(null)) return false;
  if (ends.length === 1) return step === undefined;
  return ends.length === 2 && ends[0]! <= ends[1]!;
}

function numberOf(text: string, field: Field): number | null {
  const named = field.names.indexOf(text.toLowerCase());
  if (named >= 0) return field.names === MONTHS ? named + 1 : named;
  if (!/^[0-9]{1,2}$/.test(text)) return null;
  const value = Number(text);
  return value >= field.low && value <= field.high ? value : null;
}
