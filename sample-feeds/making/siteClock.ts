import type { ClockTable } from '../../detectors/time/siteClock.ts';
import { parseClockTable } from '../../detectors/time/siteClock.ts';
import { FIRST_NIGHT_MJD, LAST_NIGHT_MJD, SITES, type SiteName } from './observatory.ts';

const MARGIN_DAYS = 15;
const ROW_EVERY_DAYS = 5;
/** 2050: the nights were over long ago, and the demo is not about a table that has run out. */
const CONTINUED_TO_MJD = 69_807;

/** A maser's slow drift against UTC, measured every five days: complete and right but for the step that nobody noticed. */
const DRIFT: Readonly<Record<SiteName, (days: number) => number>> = {
  'kestrel ridge': (days) => -1.42e-6 + 2.6e-9 * days + 6e-8 * Math.sin(days / 41),
  'kestrel annex': (days) => 3.05e-6 - 4.1e-9 * days + 9e-8 * Math.sin(days / 29 + 1),
};

export function clockTableText(site: SiteName): string {
  const rows = [`# ${site}: what to add to the site clock's reading to get UTC`, 'mjd,add_seconds'];
  for (let mjd = FIRST_NIGHT_MJD - MARGIN_DAYS; mjd <= LAST_NIGHT_MJD + MARGIN_DAYS; mjd += ROW_EVERY_DAYS) {
    rows.push(`${mjd}.0,${DRIFT[site](mjd - FIRST_NIGHT_MJD).toFixed(9)}`);
  }
  const last = LAST_NIGHT_MJD + MARGIN_DAYS;
  rows.push(`${CONTINUED_TO_MJD}.0,${DRIFT[site](last - FIRST_NIGHT_MJD).toFixed(9)}`);
  return `${rows.join('\n')}\n`;
}

export function clockTable(site: SiteName): ClockTable {
  const read = parseClockTable(clockTableText(site), SITES[site].clockTable);
  if ('problems' in read) throw new Error(read.problems[0]?.message);
  return read.table;
}
