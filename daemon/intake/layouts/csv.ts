import type { ReceivedArrival } from '../../../detectors/arrival.ts';
import { arrivalOf, type Column, type RowProblem } from '../arrivalFields.ts';
import { type ArrivalFile, faulty, SortedRows } from '../rows.ts';
import { csvRecords } from './csvRecords.ts';
import { headerFault, ignoredColumns, MOST_COLUMNS } from './tableHeader.ts';
import { giveUpCutRow, textBody } from './textBytes.ts';

/** Layout `csv`: RFC 4180 with a header row. */
export function readCsv(received: Buffer): ArrivalFile {
  const body = textBody(received);
  if ('fault' in body) return faulty(body.fault);
  const records = csvRecords(body.bytes);
  const first = records.next().value;
  if (!first) return faulty('holds no header and no rows');
  const header = headerOf(first);
  if ('fault' in header) return faulty(header.fault);

  const sorted = new SortedRows();
  for (const record of records) {
    const row = 'problem' in record ? { column: null, reason: record.problem } : rowOf(record.fields, header);
    const fault = sorted.add(record.line, row);
    if (fault !== null) return faulty(fault);
  }
  if (body.zeros > 0) giveUpCutRow(body, sorted);
  const { rows, rejects } = sorted;
  const unterminated = body.open && body.zeros === 0;
  return { rows, rejects, fault: null, unterminated, ignoredColumns: header.ignored, warnings: [] };
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
  const fault = headerFault(fields);
  if (fault !== null) return { fault: `${where} ${fault}` };
  const placeOf = new Map(fields.map((field, index) => [field, index]));
  return { width: fields.length, placeOf, ignored: ignoredColumns(fields) };
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
