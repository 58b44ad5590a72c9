import { type CorrectionLayout, type CorrectionTable, correctionAt, parseCorrectionTable } from './correctionTable.ts';
import type { TableValue } from './leapSeconds.ts';
import type { Mjd } from './mjd.ts';

/**
 * TT(BIPM) − TT(TAI): how far the best terrestrial time, which the BIPM computes afresh each January, is from TAI + 32.184 s. It is
 * 27.7 µs by now and changes by some 10 ns a month (BIPM, *TT(BIPM)*, yearly files).
 */
export type TtBipmTable = CorrectionTable;

const LAYOUT: CorrectionLayout = {
  column: 'tt_bipm_minus_tt_tai_us',
  secondsPerUnit: 1e-6,
  unit: 'µs',
  largest: { value: 1000, inWords: '1000 µs' },
};

/** Reads a CSV text with the header `mjd,tt_bipm_minus_tt_tai_us`; the dates are UTC days. */
export function parseTtBipmTable(csvText: string, name: string): ReturnType<typeof parseCorrectionTable> {
  return parseCorrectionTable(csvText, name, LAYOUT);
}

/** What is to be added to TT(TAI), s; 0 without a table. */
export function ttBipmMinusTtTai(table: TtBipmTable | null, utc: Mjd): TableValue {
  return table === null ? NO_TABLE : correctionAt(table, utc, 'TT(BIPM) table');
}

/** Not marked: it is the operator's choice, and a constant in the phase but for a few ns a year. */
const NO_TABLE: TableValue = { seconds: 0, quality: 'ok', reason: '' };
