import type { EarthOrientationTable } from './earthOrientation.ts';

/**
 * Reads the two open formats in which the IERS publishes daily Earth orientation, told apart line by line:
 *
 * - *finals2000A* (fixed columns, Bulletin A values; readme.finals2000A): MJD 8–15, x 19–27, y 38–46, UT1−UTC 59–68;
 *   days at the end whose values are still blank close the table;
 * - *EOP C04* (columns by blanks): year, month, day, [hour,] MJD, x, y, UT1−UTC, …; lines of words or `#` are comments.
 *
 * Angles in arcseconds, UT1 − UTC in seconds. A problem is a sentence and its line, counted from 1; null: of the whole file.
 */
export function parseEarthOrientation(
  text: string,
  name: string,
): { readonly table: EarthOrientationTable } | { readonly problem: string; readonly line: number | null } {
  const rows: Row[] = [];
  for (const [index, line] of text.split(/\r?\n/).entries()) {
    const row = FIXED_COLUMNS.test(line) ? fixedColumns(line) : blankSeparated(line);
    if (row === 'none') continue;
    if (row === 'blank day') break;
    if (row === 'bad') return { problem: 'not a row of finals2000A or EOP C04', line: index + 1 };
    const last = rows.at(-1);
    if (last !== undefined && row.mjd <= last.mjd) return { problem: `MJD ${row.mjd} does not rise`, line: index + 1 };
    rows.push(row);
  }
  if (rows.length === 0) return { problem: 'no row of finals2000A or EOP C04 in it', line: null };
  return {
    table: {
      name,
      mjdUtc: Float64Array.from(rows, (row) => row.mjd),
      ut1MinusUtcS: Float64Array.from(rows, (row) => row.ut1MinusUtcS),
      xArcsec: Float64Array.from(rows, (row) => row.x),
      yArcsec: Float64Array.from(rows, (row) => row.y),
    },
  };
}

interface Row {
  readonly mjd: number;
  readonly x: number;
  readonly y: number;
  readonly ut1MinusUtcS: number;
}

/** Year, month, day in two places each, then the date with two decimals in columns 8–15. */
const FIXED_COLUMNS = /^[ \d]{6} [ \d]{5}\.\d\d/;

function fixedColumns(line: string): Row | 'blank day' | 'bad' {
  const cells = [line.slice(7, 15), line.slice(18, 27), line.slice(37, 46), line.slice(58, 68)];
  if (cells.slice(1).every((cell) => cell.trim() === '')) return 'blank day';
  return rowOf(cells);
}

function blankSeparated(line: string): Row | 'none' | 'bad' {
  const cells = line.trim().split(/\s+/);
  if (!/^\d{4}$/.test(cells[0]!) || !/^\d{1,2}$/.test(cells[1] ?? '')) return 'none';
  // With the hour column the date moves one to the right; an hour is never this large.
  const date = Number(cells[3]) > 24 ? 3 : 4;
  return rowOf(cells.slice(date, date + 4));
}

function rowOf(cells: readonly string[]): Row | 'bad' {
  const [mjd, x, y, ut1MinusUtcS] = cells.map((cell) => (cell.trim() === '' ? Number.NaN : Number(cell)));
  if (mjd === undefined || x === undefined || y === undefined || ut1MinusUtcS === undefined) return 'bad';
  const plausible = Math.abs(x) < 2 && Math.abs(y) < 2 && Math.abs(ut1MinusUtcS) < 2 && mjd > 30_000 && mjd < 100_000;
  return plausible ? { mjd, x, y, ut1MinusUtcS } : 'bad';
}
