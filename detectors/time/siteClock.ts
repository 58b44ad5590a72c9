import { type CorrectionLayout, type CorrectionTable, correctionAt, parseCorrectionTable } from './correctionTable.ts';
import type { TableValue } from './leapSeconds.ts';
import type { Mjd } from './mjd.ts';

/** What has to be added to a site clock's reading to get UTC. */
export type ClockTable = CorrectionTable;

/** A clock further off than an hour is not a clock correction but a wrong column. */
const LAYOUT: CorrectionLayout = {
  column: 'add_seconds',
  secondsPerUnit: 1,
  unit: 's',
  largest: { value: 3600, inWords: 'an hour' },
};

/** Reads a CSV text with the header `mjd,add_seconds`. */
export function parseClockTable(csvText: string, name: string): ReturnType<typeof parseCorrectionTable> {
  return parseCorrectionTable(csvText, name, LAYOUT);
}

/** UTC − the clock's reading, s. */
export function clockCorrection(table: ClockTable, reading: Mjd): TableValue {
  return correctionAt(table, reading, 'clock table');
}
