import type { ReceivedArrival } from '../../../detectors/arrival.ts';
import { isProblem, type RowProblem } from '../arrivalFields.ts';

/** A complaint that also says where, in a file without lines of our counting, the row stands. */
export function placed(row: ReceivedArrival | RowProblem, where: string): ReceivedArrival | RowProblem {
  return isProblem(row) ? { ...row, reason: `${row.reason} (${where})` } : row;
}
