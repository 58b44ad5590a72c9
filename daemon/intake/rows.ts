import type { ReceivedArrival } from '../../detectors/arrival.ts';
import { closestName } from '../closestName.ts';
import { quoted, visibleText } from '../visibleText.ts';
import {
  ALL_COLUMNS,
  arrivalOf,
  type Column,
  isProblem,
  REQUIRED_COLUMNS,
  type RowProblem,
  TIME_COLUMNS,
} from './arrivalFields.ts';
import { csvRecords } from './csv.ts';

/** An arrival file in layout `csv`, as rows and refusals: every row that stands in it is one or the other. */
export interface ArrivalFile {
  readonly rows: readonly ReceivedRow[];
  readonly rejects: readonly RejectedRow[];
  /** Why nothing of the file can be used; then there are neither rows nor rejects. */
  readonly fault: string | null;
  /**
   * The last row has no line end. It is read like the others, but its last number may be cut short: take the file in only
   * once it has stood still for longer than a pausing writer would.
   */
  readonly unterminated: boolean;
  /** Columns of the header that are not ours; their contents are not kept. */
  readonly ignoredColumns: readonly string[];
}

export interface ReceivedRow extends ReceivedArrival {
  /** Counted from 1; of a row over several lines, the first. */
  readonly line: number;
}

export interface RejectedRow extends RowProblem {
  readonly line: number;
}

/** Above this many, with the good rows in the minority, the file is not what it says it is. */
const MOST_REJECTS = 10_000;
const MOST_COLUMNS = 200;
const LF = 0x0a;

export function readArrivalFile(received: Buffer): ArrivalFile {
  const encoding = encodingFault(received);
  if (encoding !== null) return faulty(encoding);
  const zeros = zeroTail(received);
  const bytes = received.subarray(hasByteOrderMark(received) ? 3 : 0, received.length - zeros);

  const records = csvRecords(bytes);
  const first = records.next().value;
  if (!first) return faulty('holds no header and no rows');
  const header = headerOf(first);
  if ('fault' in header) return faulty(header.fault);

  const rows: ReceivedRow[] = [];
  const rejects: RejectedRow[] = [];
  for (const record of records) {
    const row = 'problem' in record ? { column: null, reason: record.problem } : rowOf(record.fields, header);
    if (isProblem(row)) rejects.push({ line: record.line, ...row });
    else rows.push({ line: record.line, ...row });
    if (rejects.length > MOST_REJECTS && rejects.length > rows.length) {
      const { line, reason } = rejects[0]!;
      return faulty(`more than ${MOST_REJECTS} rows cannot be used, the first on line ${line}: ${reason}`);
    }
  }
  const open = bytes.at(-1) !== LF;
  if (zeros > 0) giveUpCutRow(bytes, { rows, rejects, zeros, open });
  return { rows, rejects, fault: null, unterminated: open && zeros === 0, ignoredColumns: header.ignored };
}

function faulty(fault: string): ArrivalFile {
  return { rows: [], rejects: [], fault, unterminated: false, ignoredColumns: [] };
}

function hasByteOrderMark(bytes: Buffer): boolean {
  return bytes[0] === 0xef && bytes[1] === 0xbb && bytes[2] === 0xbf;
}

function encodingFault(bytes: Buffer): string | null {
  if (bytes.length === 0) return 'is empty';
  const [first, second] = bytes;
  if ((first === 0xff && second === 0xfe) || (first === 0xfe && second === 0xff)) {
    return 'is UTF-16 text; deliver it as UTF-8';
  }
  return null;
}

/** Length of a run of zero bytes at the end: what some file systems leave after a crash. */
function zeroTail(bytes: Buffer): number {
  let zeros = 0;
  while (zeros < bytes.length && bytes[bytes.length - 1 - zeros] === 0) zeros += 1;
  return zeros;
}

/** Zeros behind a line end cost nothing but a note; zeros behind half a row mean that the row was cut. */
function giveUpCutRow(
  bytes: Buffer,
  found: { rows: ReceivedRow[]; rejects: RejectedRow[]; readonly zeros: number; readonly open: boolean },
): void {
  const reason = `${found.zeros} zero bytes stand at the end of the file`;
  let line = 1;
  for (let at = bytes.indexOf(LF); at >= 0; at = bytes.indexOf(LF, at + 1)) line += 1;
  if (found.open && found.rows.at(-1)?.line === line) found.rows.pop();
  if (found.rejects.at(-1)?.line !== line) found.rejects.push({ line, column: null, reason });
}

interface Header {
  readonly width: number;
  readonly placeOf: ReadonlyMap<string, number>;
  readonly ignored: readonly string[];
}

function headerOf(
  record: { readonly line: number } & ({ fields: readonly string[] } | { problem: string }),
): Header | { fault: string } {
  const where = `line ${record.line}, the header:`;
  if ('problem' in record) return { fault: `${where} ${record.problem}` };
  const { fields } = record;
  if (fields.some((field) => field.includes('\0'))) return { fault: 'is not a text table: it holds zero bytes' };
  if (fields.some((field) => field.includes('\r'))) {
    return { fault: `${where} lines end in CR alone; deliver it with LF or CRLF` };
  }
  if (fields.length > MOST_COLUMNS) return { fault: `${where} more than ${MOST_COLUMNS} columns` };
  const twice = fields.find((field, index) => field !== '' && fields.indexOf(field) < index);
  if (twice !== undefined) return { fault: `${where} the column ${quoted(twice)} stands there twice` };

  const placeOf = new Map(fields.map((field, index) => [field, index]));
  const missing: string[] = REQUIRED_COLUMNS.filter((column) => !placeOf.has(column));
  if (!TIME_COLUMNS.some((column) => placeOf.has(column))) missing.push('mjd_utc (or mjd_tdb)');
  if (missing.length > 0) {
    const found = fields.slice(0, 20).map(quoted).join(', ');
    return { fault: `${where} no column ${missing.join(', ')}; found ${found.slice(0, 500)}` };
  }
  const known: readonly string[] = ALL_COLUMNS;
  const ignored = fields.filter((field) => !known.includes(field)).map((field) => ignoredColumn(field, known));
  return { width: fields.length, placeOf, ignored };
}

function ignoredColumn(field: string, known: readonly string[]): string {
  const near = closestName(field, known);
  return near === null ? visibleText(field) : `${visibleText(field)} (did you mean ${near}?)`;
}

function rowOf(fields: readonly string[], header: Header): ReceivedArrival | RowProblem {
  if (fields.length !== header.width) {
    return { column: null, reason: `has ${fields.length} fields, the header ${header.width}` };
  }
  return arrivalOf((column: Column) => {
    const place = header.placeOf.get(column);
    return place === undefined ? '' : fields[place]!;
  });
}
