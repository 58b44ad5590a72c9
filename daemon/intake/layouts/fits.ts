import { quoted } from '../../visibleText.ts';
import { type ArrivalFile, faulty, SortedRows } from '../rows.ts';
import { type ArrivalTable, arrivalTable } from './arrivalTable.ts';
import { type FitsColumn, fitsColumn } from './fitsColumn.ts';
import { FitsFault, type HeaderUnit, headerUnits, wholeCard } from './fitsHeader.ts';
import { placed } from './placed.ts';

/**
 * Layout `fits`: the rows of every binary table (FITS Standard 4.0, section 7.3) that has the columns of an arrival, whichever HDU it is; column
 * names in upper or lower case. Rows are counted through the file.
 */
export function readFits(bytes: Buffer): ArrivalFile {
  if (bytes.length === 0) return faulty('is empty');
  try {
    return readTables(bytes);
  } catch (error) {
    if (error instanceof FitsFault) return faulty(error.message, { unterminated: error.cutShort });
    throw error;
  }
}

const MOST_FIELDS = 999;

function readTables(bytes: Buffer): ArrivalFile {
  const sorted = new SortedRows();
  const [ignored, warnings, passedOver] = [new Set<string>(), new Set<string>(), [] as string[]];
  let tables = 0;
  let before = 0;
  for (const unit of headerUnits(bytes)) {
    if (unit.cards.get('XTENSION') !== 'BINTABLE') continue;
    const table = tableIn(unit);
    if ('fault' in table) {
      passedOver.push(`HDU ${unit.number}: ${table.fault}`);
      continue;
    }
    tables += 1;
    for (const name of table.arrivals.ignored) ignored.add(name);
    for (const warning of table.arrivals.warnings) warnings.add(`HDU ${unit.number}: ${warning}`);
    const fault = readRows(bytes, table, { unit, before, sorted });
    if (fault !== null) return faulty(fault);
    before += table.rows;
  }
  if (tables === 0) {
    return faulty(passedOver.length === 0 ? 'holds no binary table' : passedOver.slice(0, 5).join('; '));
  }
  for (const reason of passedOver) warnings.add(`passed over: ${reason}`);
  const { rows, rejects } = sorted;
  return {
    rows,
    rejects,
    fault: null,
    unterminated: false,
    ignoredColumns: [...ignored].filter((name) => name !== ''),
    warnings: [...warnings],
  };
}

interface Table {
  readonly columns: readonly FitsColumn[];
  /** Where each column begins in a row. */
  readonly starts: readonly number[];
  readonly rowBytes: number;
  readonly rows: number;
  readonly arrivals: ArrivalTable;
}

function tableIn({ cards, number }: HeaderUnit): Table | { readonly fault: string } {
  const fields = wholeCard(cards, 'TFIELDS', { number, most: MOST_FIELDS });
  const rowBytes = wholeCard(cards, 'NAXIS1', { number });
  const rows = wholeCard(cards, 'NAXIS2', { number });
  if (cards.get('NAXIS') !== '2' || cards.get('BITPIX') !== '8')
    return { fault: 'a binary table has NAXIS = 2, BITPIX = 8' };
  const columns = Array.from({ length: fields }, (_, index) => fitsColumn(cards, index + 1, number));
  const starts: number[] = [];
  let width = 0;
  for (const column of columns) {
    starts.push(width);
    width += column.width;
  }
  if (width !== rowBytes)
    throw new FitsFault(`HDU ${number}: its columns take ${width} bytes a row, NAXIS1 says ${rowBytes}`);
  const arrivals = arrivalTable(columns);
  if ('fault' in arrivals) return arrivals;
  for (const place of arrivals.used) {
    const { name, trouble } = columns[place]!;
    if (trouble !== null) throw new FitsFault(`HDU ${number}: the column ${quoted(name)} ${trouble}`);
  }
  return { columns, starts, rowBytes, rows, arrivals };
}

/** Returns why the file must be given up; null: it need not. */
function readRows(
  bytes: Buffer,
  { columns, starts, rowBytes, rows, arrivals }: Table,
  into: { readonly unit: HeaderUnit; readonly before: number; readonly sorted: SortedRows },
): string | null {
  for (let row = 0; row < rows; row += 1) {
    const start = into.unit.dataStart + row * rowBytes;
    const arrival = arrivals.arrivalAt((place) => columns[place]!.textAt(bytes, start + starts[place]!));
    const where = `row ${row + 1} of HDU ${into.unit.number}`;
    const fault = into.sorted.add(into.before + row + 1, placed(arrival, where));
    if (fault !== null) return fault;
  }
  return null;
}
