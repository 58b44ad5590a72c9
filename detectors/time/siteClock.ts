import type { TableValue } from './leapSeconds.ts';
import { type Mjd, mjdNumber } from './mjd.ts';
import { firstAfter } from './risingDates.ts';

/** What has to be added to a site clock's reading to get UTC. Straight lines between the rows; two rows of one date are a step. */
export interface ClockTable {
  readonly name: string;
  /** UTC, never falling. */
  readonly mjd: Float64Array;
  readonly addSeconds: Float64Array;
}

export interface ClockTableProblem {
  /** Counted from 1. */
  readonly line: number;
  readonly message: string;
}

const HEADER = 'mjd,add_seconds';
const NUMBER = /^[+-]?[0-9]+(?:\.[0-9]+)?(?:[eE][+-]?[0-9]+)?$/;
/** A clock further off than this is not a clock correction but a wrong column. */
const LARGEST_CORRECTION_S = 3600;

/**
 * Reads a CSV text with the header `mjd,add_seconds`; empty lines and lines that start with # are passed over. Tables kept
 * for years by hand hold rows out of order: these are put in their place and named in `warnings`.
 */
export function parseClockTable(
  csvText: string,
  name: string,
):
  | { readonly table: ClockTable; readonly warnings: readonly ClockTableProblem[] }
  | { readonly problems: readonly ClockTableProblem[] } {
  const problems: ClockTableProblem[] = [];
  const warnings: ClockTableProblem[] = [];
  const mjd: number[] = [];
  const addSeconds: number[] = [];
  let headerSeen = false;
  const lines = csvText.replace(/^\uFEFF/, '').split(/\r?\n/);
  for (const [index, text] of lines.entries()) {
    const line = index + 1;
    const content = text.trim();
    if (content === '' || content.startsWith('#')) continue;
    const cells = content.split(',').map((cell) => cell.trim());
    if (!headerSeen) {
      headerSeen = true;
      if (cells.join(',') === HEADER) continue;
      return { problems: [{ line, message: `the first row must be the header "${HEADER}", found "${content}"` }] };
    }
    const problem = rowProblem(cells, mjd);
    if (problem !== null) {
      problems.push({ line, message: problem });
      continue;
    }
    const date = Number(cells[0]);
    const place = firstAfter(mjd, date);
    if (place < mjd.length)
      warnings.push({ line, message: `mjd ${date} comes after mjd ${mjd.at(-1)}: the row was put in its place` });
    mjd.splice(place, 0, date);
    addSeconds.splice(place, 0, Number(cells[1]));
  }
  if (problems.length > 0) return { problems };
  if (mjd.length === 0) return { problems: [{ line: lines.length, message: 'the table has no rows' }] };
  return { table: { name, mjd: Float64Array.from(mjd), addSeconds: Float64Array.from(addSeconds) }, warnings };
}

function rowProblem(cells: readonly string[], earlier: readonly number[]): string | null {
  if (cells.length !== 2) return `expected 2 columns (${HEADER}), found ${cells.length}`;
  for (const [column, cell] of cells.entries()) {
    if (!NUMBER.test(cell) || !Number.isFinite(Number(cell))) {
      return `column ${column === 0 ? 'mjd' : 'add_seconds'}: "${cell}" is not a number`;
    }
  }
  const date = Number(cells[0]);
  if (Math.abs(Number(cells[1])) > LARGEST_CORRECTION_S) return `a correction of ${cells[1]} s is more than an hour`;
  const place = firstAfter(earlier, date);
  if (place >= 2 && earlier[place - 2] === date) return `mjd ${date} stands there three times`;
  return null;
}

/**
 * The correction at a date, s. At a step the later row holds from the step's own instant on. Outside the table the end value
 * is held (never the slope) and the answer is marked `extrapolated`.
 */
export function clockCorrection(table: ClockTable, reading: Mjd): TableValue {
  const at = mjdNumber(reading);
  const { mjd, addSeconds } = table;
  const last = mjd.length - 1;
  if (last < 0) return { seconds: 0, quality: 'extrapolated', reason: `clock table ${table.name} is empty` };
  if (at < mjd[0]!) return outside(table, addSeconds[0]!, `begins at MJD ${mjd[0]}`);
  if (at > mjd[last]!) return outside(table, addSeconds[last]!, `ended at MJD ${mjd[last]}`);
  const after = firstAfter(mjd, at);
  const right = addSeconds[after];
  const left = addSeconds[after - 1]!;
  if (right === undefined) return { seconds: left, quality: 'ok', reason: '' };
  const from = mjd[after - 1]!;
  const share = (reading.day - from + reading.fraction) / (mjd[after]! - from);
  return { seconds: left + share * (right - left), quality: 'ok', reason: '' };
}

function outside(table: ClockTable, seconds: number, what: string): TableValue {
  return { seconds, quality: 'extrapolated', reason: `clock table ${table.name} ${what}; its end value is held` };
}
