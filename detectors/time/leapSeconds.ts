import type { Quality } from '../arrival.ts';

/**
 * TAI − UTC from the list that IERS and IETF publish (`leap-seconds.list`). The table is data handed in; whether its SHA-1 line is right is
 * the loader's business.
 */
export interface LeapSecondTable {
  /** Oldest first. Before the first entry (1972) UTC had no whole-second steps and no answer is given. */
  readonly entries: readonly LeapSecond[];
  /** After this date a leap second may have come that the table does not know. */
  readonly expiresMjd: number;
}

export interface LeapSecond {
  /** UTC day from whose start on the value holds. */
  readonly mjd: number;
  readonly taiMinusUtcS: number;
}

export interface TableValue {
  readonly seconds: number;
  readonly quality: Quality;
  /** Empty when the quality is `ok`. */
  readonly reason: string;
}

/** MJD of the epoch of the list's time stamps, 1900-01-01. */
const NTP_EPOCH_MJD = 15_020;

/** Reads the text of a `leap-seconds.list`; a problem is a sentence with the line number. */
export function parseLeapSeconds(text: string): { readonly table: LeapSecondTable } | { readonly problem: string } {
  const entries: LeapSecond[] = [];
  let expiresMjd: number | null = null;
  for (const [index, line] of text.split(/\r?\n/).entries()) {
    const expiry = /^#@\s+(\d+)\s*$/.exec(line);
    if (expiry !== null) expiresMjd = ntpToMjd(Number(expiry[1]));
    if (line.startsWith('#') || line.trim() === '') continue;
    const row = /^(\d+)\s+(\d+)\s*(?:#.*)?$/.exec(line);
    if (row === null) return { problem: `line ${index + 1}: not a time stamp and a whole number of seconds` };
    const entry = { mjd: ntpToMjd(Number(row[1])), taiMinusUtcS: Number(row[2]) };
    const last = entries.at(-1);
    if (!Number.isInteger(entry.mjd)) return { problem: `line ${index + 1}: not the start of a day` };
    if (last !== undefined && (entry.mjd <= last.mjd || Math.abs(entry.taiMinusUtcS - last.taiMinusUtcS) !== 1)) {
      return { problem: `line ${index + 1}: must be later than the line before it and one second apart` };
    }
    entries.push(entry);
  }
  if (entries.length === 0) return { problem: 'no leap seconds in it' };
  if (expiresMjd === null) return { problem: 'the line with the expiry date (#@) is missing' };
  return { table: { entries, expiresMjd } };
}

function ntpToMjd(seconds: number): number {
  return NTP_EPOCH_MJD + seconds / 86_400;
}

/** TAI − UTC on a UTC day, s. */
export function taiMinusUtcS(table: LeapSecondTable, utcDay: number): TableValue {
  const seconds = valueOn(table, utcDay);
  if (seconds === null) {
    return { seconds: 0, quality: 'unusable', reason: `MJD ${utcDay} is before UTC had leap seconds (MJD 41317)` };
  }
  if (utcDay < table.expiresMjd) return { seconds, quality: 'ok', reason: '' };
  return { seconds, quality: 'extrapolated', reason: `the leap-second table ended at MJD ${table.expiresMjd}` };
}

/** Length of a UTC day, s: 86 401 when a leap second is put in at its end. */
export function utcDayLengthS(table: LeapSecondTable, utcDay: number): number {
  const today = valueOn(table, utcDay);
  const tomorrow = valueOn(table, utcDay + 1);
  return today === null || tomorrow === null ? 86_400 : 86_400 + tomorrow - today;
}

/** Searched from the new end: nearly every arrival is recent. */
function valueOn(table: LeapSecondTable, utcDay: number): number | null {
  for (let i = table.entries.length - 1; i >= 0; i--) {
    const entry = table.entries[i]!;
    if (utcDay >= entry.mjd) return entry.taiMinusUtcS;
  }
  return null;
}
