import { oneLine } from '../markup.ts';

export type Cell = string | number | null;
export type CsvColumns<Row> = readonly (readonly [name: string, cell: (row: Row) => Cell])[];

/** A table for spreadsheets (RFC 4180: CRLF, header row, quotes doubled). An unknown number is an empty cell. */
export function csvTable<Row>(rows: readonly Row[], columns: CsvColumns<Row>): string {
  const lines = rows.map((row) => columns.map(([, cell]) => cellText(cell(row))).join(','));
  return [columns.map(([name]) => name).join(','), ...lines].map((line) => `${line}\r\n`).join('');
}

function cellText(cell: Cell): string {
  if (cell === null) return '';
  if (typeof cell === 'number') return Number.isFinite(cell) ? String(cell) : '';
  const safe = inert(oneLine(cell));
  return /[",\r\n]/.test(safe) ? `"${safe.replace(/"/g, '""')}"` : safe;
}

/**
 * Text that a spreadsheet would run as a formula gets an apostrophe in front (common practice, OWASP "CSV Injection", from memory);
 * numbers are written by us and keep their minus sign.
 */
function inert(text: string): string {
  return /^\s*[=+\-@＝＋－＠]/.test(text) ? `'${text}` : text;
}
