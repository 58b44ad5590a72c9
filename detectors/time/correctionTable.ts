import type { TableValue } from './leapSeconds.ts';
import { type Mjd, mjdNumber } from './mjd.ts';
import { firstAfter } from './risingDates.ts';

/** Seconds to be added to a clock's reading. Straight lines between the rows; two rows of one date are a step. */
export interface CorrectionTable {
  readonly name: string;
  /** UTC, never falling. */
  readonly mjd: Float64Array;
  readonly addSeconds: Float64Array;
}

export interface CorrectionProblem {
  /** Counted from 1. */
  readonly line: number;
  readonly message: string;
}

/** The columns of one kind of table: `mjd` and the one that is named here. */
export interface CorrectionLayout {
  readonly column: string;
  readonly secondsPerUnit: number;
  readonly unit: string;
  /** In `unit`. A larger correction is a wrong column. */
  readonly largest: { readonly value: number; readonly inWords: string };
}

const NUMBER = /^[+-]?[0-9]+(?:\.[0-9]+)?(?:[eE][+-]?[0-9]+)?$/;

/**
 * Reads a CSV text with the header `mjd,<column>`; empty lines and lines that start with # are passed over. Tables kept
 * for years by hand hold rows out of order: these are put in their place and named in `warnings`.
 */
export function parseCorrectionTable(
  csvText: string,
  name: string,
  layout: CorrectionLayout,
):
  | { readonly table: CorrectionTable; readonly warnings: readonly CorrectionProblem[] }
  | { readonly problems: readonly CorrectionProblem[] } {
  const problems: CorrectionProblem[] = [];
  const warnings: CorrectionProblem[] = [];
  const mjd: number[] = [];
  const addSeconds: number[] = [];
  const header = `mjd,${layout.column}`;
  let headerSeen = false;
  const lines = csvText.replace(/^\uFEFF/, '').split(/\r?\n/);
  for (const [index, text] of lines.entries()) {
    const line = index + 1;
    const content = text.trim();
    if (content === '' || content.startsWith('#')) continue;
    const cells = content.split(',').map((cell) => cell.trim());
    if (!headerSeen) {
      headerSeen = true;
      if (cells.join(',') === header) continue;
      return { problems: [{ line, message: `the first row must be the header "${header}", found "${content}"` }] };
    }
    const problem = rowProblem(cells, mjd, layout);
    if (problem !== null) {
      problems.push({ line, message: problem });
      continue;
    }
    const date = Number(cells[0]);
    const place = firstAfter(mjd, date);
    if (place < mjd.length)
      warnings.push({ line, message: `mjd ${date} comes after mjd ${mjd.at(-1)}: the row was put in its place` });
    mjd.splice(place, 0, date);
    addSeconds.splice(place, 0, Number(cells[1]) * layout.secondsPerUnit);
  }
  if (problems.length > 0) return { problems };
  if (mjd.length === 0) return { problems: [{ line: lines.length, message: 'the table has no rows' }] };
  return { table: { name, mjd: Float64Array.from(mjd), addSeconds: Float64Array.from(addSeconds) }, warnings };
}

function rowProblem(
  cells: readonly string[],
  earlier: readonly number[],
  { column, unit, largest }: CorrectionLayout,
): string | null {
  if (cells.length !== 2) return `expected 2 columns (mjd,${column}), found ${cells.length}`;
  for (const [index, cell] of cells.entries()) {
    if (!NUMBER.test(cell) || !Number.isFinite(Number(cell))) {
      return `column ${index === 0 ? 'mjd' : column}: "${cell}" is not a number`;
    }
  }
  const date = Number(cells[0]);
  if (Math.abs(Number(cells[1])) > largest.value)
    return `a correction of ${cells[1]} ${unit} is more than ${largest.inWords}`;
  const place = firstAfter(earlier, date);
  if (place >= 2 && earlier[place - 2] === date) return `mjd ${date} stands there three times`;
  return null;
}

/**
 * The correction at a date, s; `kind` names the table in the reason. At a step the later row holds from the step's own instant on. Outside the table the end value
 * is held (never the slope) and the answer is marked `extrapolated`.
 */
export function correctionAt(table: CorrectionTable, reading: Mjd, kind: string): TableValue {
  const at = mjdNumber(reading);
  const { mjd, addSeconds } = table;
  const last = mjd.length - 1;
  if (last < 0) return { seconds: 0, quality: 'extrapolated', reason: `${kind} ${table.name} is empty` };
  if (at < mjd[0]!) return outside(table, addSeconds[0]!, kind, `begins at MJD ${mjd[0]}`);
  if (at > mjd[last]!) return outside(table, addSeconds[last]!, kind, `ended at MJD ${mjd[last]}`);
  const after = firstAfter(mjd, at);
  const right = addSeconds[after];
  const left = addSeconds[after - 1]!;
  if (right === undefined) return { seconds: left, quality: 'ok', reason: '' };
  const from = mjd[after - 1]!;
  const share = (reading.day - from + reading.fraction) / (mjd[after]! - from);
  return { seconds: left + share * (right - left), quality: 'ok', reason: '' };
}

function outside(table: CorrectionTable, seconds: number, kind: string, what: string): TableValue {
  return { seconds, quality: 'extrapolated', reason: `${kind} ${table.name} ${what}; its end value is held` };
}
