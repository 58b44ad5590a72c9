import type { ReceivedArrival } from '../../detectors/arrival.ts';
import { isProblem, type RowProblem } from './arrivalFields.ts';

/** An arrival file of any layout, as rows and refusals: every row that stands in it is one or the other. */
export interface ArrivalFile {
  readonly rows: readonly ReceivedRow[];
  readonly rejects: readonly RejectedRow[];
  /** Why nothing of the file can be used; then there are neither rows nor rejects. */
  readonly fault: string | null;
  /**
   * The file may still be growing: its last row has no line end, or the file is shorter than it says. Take it in only once it
   * has stood still for longer than a pausing writer would.
   */
  readonly unterminated: boolean;
  /** Columns that are not ours; their contents are not kept. */
  readonly ignoredColumns: readonly string[];
  /** What the reader had to assume or pass over, in words. */
  readonly warnings: readonly string[];
}

export interface ReceivedRow extends ReceivedArrival {
  /** Counted from 1; of a row over several lines, the first. In a table without lines, its row, counted through the file. */
  readonly line: number;
}

export interface RejectedRow extends RowProblem {
  readonly line: number;
}

/** Above this many, with the good rows in the minority, the file is not what it says it is. */
const MOST_REJECTS = 10_000;

/** A file of which nothing can be used. */
export function faulty(fault: string, { unterminated = false } = {}): ArrivalFile {
  return { rows: [], rejects: [], fault, unterminated, ignoredColumns: [], warnings: [] };
}

/** Sorts what a reader hands in. */
export class SortedRows {
  readonly rows: ReceivedRow[] = [];
  readonly rejects: RejectedRow[] = [];

  /** Returns why the file must be given up, once far more rows are bad than good; null: go on. */
  add(line: number, row: ReceivedArrival | RowProblem): string | null {
    if (isProblem(row)) this.rejects.push({ line, ...row });
    else this.rows.push({ line, ...row });
    if (this.rejects.length <= MOST_REJECTS || this.rejects.length <= this.rows.length) return null;
    const first = this.rejects[0]!;
    const column = first.column === null ? '' : `${first.column} `;
    return `more than ${MOST_REJECTS} rows cannot be used, the first on line ${first.line}: ${column}${first.reason}`;
  }
}
