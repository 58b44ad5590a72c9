import type { ReceivedArrival } from '../../../detectors/arrival.ts';
import { quoted } from '../../visibleText.ts';
import type { RowProblem } from '../arrivalFields.ts';
import { type ArrivalFile, faulty, SortedRows } from '../rows.ts';
import { type ArrivalTable, arrivalTable } from './arrivalTable.ts';
import { placed } from './placed.ts';
import { MOST_COLUMNS } from './tableHeader.ts';
import { type Attributes, binaryCell, binaryText, cellText, type VotableField, votableField } from './votableField.ts';

export class VotableFault extends Error {
  readonly cutShort: boolean;
  constructor(message: string, { cutShort = false } = {}) {
    super(message);
    this.cutShort = cutShort;
  }
}

/** Ways of writing rows that are not read. */
const OTHER_FORMS = ['BINARY', 'FITS', 'PARQUET'];
const FORMS = ['TABLEDATA', 'BINARY2', ...OTHER_FORMS];

/** The tables of a VOTable, as its elements pass by. Methods throw a `VotableFault` where nothing of the file can be used. */
export class VotableTables {
  readonly #sorted = new SortedRows();
  readonly #ignored = new Set<string>();
  readonly #warnings = new Set<string>();
  readonly #passedOver: string[] = [];
  readonly #path: string[] = [];
  #tables = 0;
  #arrivalTables = 0;
  #rows = 0;
  #fields: VotableField[] = [];
  /** The head of the table is over. */
  #hasData = false;
  /** Of the table whose data are passing; null: one without arrivals. */
  #arrivals: ArrivalTable | null = null;
  #cells: string[] = [];
  /** Null: text is not kept here. */
  #text: string[] | null = null;
  #rowLine = 0;

  open(name: string, attributes: Attributes, line: number): void {
    const parent = this.#path.at(-1);
    if (this.#text !== null) throw new VotableFault(`line ${line}: an element stands inside a cell`);
    this.#path.push(name);
    if (name === 'DATA') this.#hasData = true;
    if (name === 'TABLE') this.#beginTable(attributes);
    else if (name === 'FIELD') this.#addField(attributes, parent, line);
    else if (name === 'VALUES' && parent === 'FIELD') this.#noteNull(attributes.null);
    else if (parent === 'DATA' && FORMS.includes(name)) this.#beginData(name, line);
    else if (name === 'TR' && parent === 'TABLEDATA') {
      this.#cells = [];
      this.#rowLine = line;
    } else if (name === 'TD' && parent === 'TR') this.#text = this.#arrivals === null ? null : [];
    else if (name === 'STREAM' && parent === 'BINARY2') this.#beginStream(attributes, line);
  }

  text(text: string): void {
    this.#text?.push(text);
  }

  close(name: string): void {
    this.#path.pop();
    if (name === 'TD' && this.#text !== null) {
      if (this.#cells.length <= this.#fields.length) this.#cells.push(this.#text.join(''));
      this.#text = null;
    } else if (name === 'TR' && this.#path.at(-1) === 'TABLEDATA' && this.#arrivals !== null) {
      this.#add(this.#rowOfCells(this.#arrivals), `XML line ${this.#rowLine}`);
    } else if (name === 'STREAM' && this.#text !== null) {
      const text = this.#text.join('');
      this.#text = null;
      this.#readStream(text);
    }
  }

  result(): ArrivalFile {
    if (this.#arrivalTables === 0) {
      return faulty(
        this.#passedOver.length === 0 ? 'holds no table with data' : this.#passedOver.slice(0, 5).join('; '),
      );
    }
    for (const reason of this.#passedOver) this.#warnings.add(`passed over: ${reason}`);
    const { rows, rejects } = this.#sorted;
    const lists = { ignoredColumns: [...this.#ignored].filter(Boolean), warnings: [...this.#warnings] };
    return { rows, rejects, fault: null, unterminated: false, ...lists };
  }

  #beginTable(attributes: Attributes): void {
    if (this.#path.slice(0, -1).includes('TABLE')) throw new VotableFault('a TABLE stands inside another');
    this.#tables += 1;
    this.#fields = [];
    this.#hasData = false;
    this.#arrivals = null;
    if (attributes.ref !== undefined) {
      throw new VotableFault(`table ${this.#tables} takes its fields from another (ref); they must stand in it`);
    }
  }

  #addField(attributes: Attributes, parent: string | undefined, line: number): void {
    if (parent !== 'TABLE' || this.#hasData) {
      throw new VotableFault(`line ${line}: a FIELD stands outside the head of a TABLE`);
    }
    if (this.#fields.length === MOST_COLUMNS) {
      throw new VotableFault(`table ${this.#tables} has more than ${MOST_COLUMNS} fields`);
    }
    this.#fields.push(votableField(attributes));
  }

  #noteNull(text: string | undefined): void {
    const field = this.#fields.at(-1);
    if (field !== undefined && text !== undefined) {
      this.#fields[this.#fields.length - 1] = { ...field, nullText: text.trim() };
    }
  }

  /** TABLEDATA, BINARY2 or another form: now the fields are complete. */
  #beginData(form: string, line: number): void {
    const arrivals = arrivalTable(this.#fields);
    if ('fault' in arrivals) {
      this.#passedOver.push(`table ${this.#tables} (line ${line}): ${arrivals.fault}`);
      return;
    }
    if (OTHER_FORMS.includes(form)) {
      throw new VotableFault(`line ${line}: rows in the form ${form} are not read; write TABLEDATA or BINARY2`);
    }
    const unreadable = arrivals.used.map((place) => this.#fields[place]!).find(({ trouble }) => trouble !== null);
    if (unreadable !== undefined) {
      throw new VotableFault(`table ${this.#tables}: the field ${quoted(unreadable.name)} ${unreadable.trouble}`);
    }
    this.#arrivalTables += 1;
    this.#arrivals = arrivals;
    for (const name of arrivals.ignored) this.#ignored.add(name);
    for (const warning of arrivals.warnings) this.#warnings.add(`table ${this.#tables}: ${warning}`);
  }

  #rowOfCells(arrivals: ArrivalTable): ReceivedArrival | RowProblem {
    const [cells, fields] = [this.#cells, this.#fields];
    if (cells.length !== fields.length) {
      const found = cells.length > fields.length ? `more than ${fields.length}` : `${cells.length}`;
      return { column: null, reason: `has ${found} cells, the table ${fields.length} fields` };
    }
    return arrivals.arrivalAt((place) => cellText(fields[place]!, cells[place]!));
  }

  #beginStream(attributes: Attributes, line: number): void {
    if (this.#arrivals === null) return;
    if (attributes.href !== undefined) {
      throw new VotableFault(
        `line ${line}: the rows stand elsewhere (href); nothing is fetched, deliver them in the file`,
      );
    }
    if (attributes.encoding !== 'base64') throw new VotableFault(`line ${line}: the stream's encoding must be base64`);
    this.#text = [];
  }

  #readStream(text: string): void {
    const encoded = text.replace(/[ \t\r\n]+/g, '');
    const table = `table ${this.#tables}`;
    if (encoded.length % 4 !== 0 || !/^[A-Za-z0-9+/]*={0,2}$/.test(encoded)) {
      throw new VotableFault(`${table}: its stream is not base64`);
    }
    const bytes = Buffer.from(encoded, 'base64');
    for (let at = 0; at < bytes.length; ) {
      const row = this.#binaryRow(bytes, at);
      if (row === null) {
        throw new VotableFault(
          `${table}, row ${this.#rows + 1}: its stream ends inside a row, or a field has no known size`,
        );
      }
      this.#add(row.arrival, `row ${this.#rows + 1}`);
      at = row.end;
    }
  }

  /** A bit for each field tells whether it is null; then come all fields, the null ones too (section 5.4). */
  #binaryRow(
    bytes: Buffer,
    at: number,
  ): { readonly arrival: ReceivedArrival | RowProblem; readonly end: number } | null {
    const fields = this.#fields;
    const cells: { readonly start: number; readonly elements: number }[] = [];
    let end = at + Math.ceil(fields.length / 8);
    for (const field of fields) {
      const cell = end <= bytes.length ? binaryCell(field, bytes, end) : null;
      if (cell === null) return null;
      cells.push(cell);
      end = cell.end;
    }
    const isNull = (place: number) => (bytes[at + (place >> 3)]! & (0x80 >> (place & 7))) !== 0;
    const arrival = this.#arrivals!.arrivalAt((place) =>
      isNull(place) ? '' : binaryText(fields[place]!, bytes, cells[place]!.start, cells[place]!.elements),
    );
    return { arrival, end };
  }

  #add(row: ReceivedArrival | RowProblem, where: string): void {
    this.#rows += 1;
    const fault = this.#sorted.add(this.#rows, placed(row, where));
    if (fault !== null) throw new VotableFault(fault);
  }
}
