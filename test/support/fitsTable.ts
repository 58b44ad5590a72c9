/** A FITS file with one binary table, put together byte by byte from the standard's pages, sharing no code with the program. */
export interface FitsTestColumn {
  readonly name: string;
  /** TFORM. */
  readonly form: string;
  readonly cells: readonly Buffer[];
  /** Further cards without the column's number, such as `TUNIT` or `TSCAL`: value as it stands in the card. */
  readonly cards?: Readonly<Record<string, string>>;
}

const BLOCK = 2880;

export function fitsTable(
  columns: readonly FitsTestColumn[],
  { extra = [], heap = Buffer.alloc(0) }: { readonly extra?: readonly string[]; readonly heap?: Buffer } = {},
): Buffer {
  const rows = columns[0]?.cells.length ?? 0;
  const data = Buffer.concat([
    ...Array.from({ length: rows }, (_, row) => Buffer.concat(columns.map(({ cells }) => cells[row]!))),
    heap,
  ]);
  const rowBytes = columns.reduce((sum, { cells }) => sum + (cells[0]?.length ?? 0), 0);
  const cards = [
    card('XTENSION', "'BINTABLE'"),
    ...numbers({ BITPIX: 8, NAXIS: 2, NAXIS1: rowBytes, NAXIS2: rows, PCOUNT: heap.length, GCOUNT: 1 }),
    ...numbers({ TFIELDS: columns.length }),
    ...columns.flatMap(({ name, form, cards: more = {} }, index) => [
      card(`TTYPE${index + 1}`, `'${name}'`),
      card(`TFORM${index + 1}`, `'${form}'`),
      ...Object.entries(more).map(([key, value]) => card(`${key}${index + 1}`, value)),
    ]),
    ...extra,
  ];
  const primary = [card('SIMPLE', 'T'), ...numbers({ BITPIX: 8, NAXIS: 0 })];
  return Buffer.concat([header(primary), header(cards), padded(data, 0)]);
}

export function card(keyword: string, value: string): string {
  return `${keyword.padEnd(8)}= ${value}`.padEnd(80);
}

function numbers(values: Readonly<Record<string, number>>): string[] {
  return Object.entries(values).map(([keyword, value]) => card(keyword, String(value).padStart(20)));
}

function header(cards: readonly string[]): Buffer {
  return padded(Buffer.from([...cards, 'END'.padEnd(80)].join('')), 0x20);
}

function padded(bytes: Buffer, fill: number): Buffer {
  return Buffer.concat([bytes, Buffer.alloc((BLOCK - (bytes.length % BLOCK)) % BLOCK, fill)]);
}

export const text = (width: number, ...values: string[]) => values.map((value) => Buffer.from(value.padEnd(width)));
export const doubles = (...values: number[]) => values.map((value) => filled(8, (b) => b.writeDoubleBE(value)));
export const floats = (...values: number[]) => values.map((value) => filled(4, (b) => b.writeFloatBE(value)));
export const ints = (...values: number[]) => values.map((value) => filled(4, (b) => b.writeInt32BE(value)));
export const longs = (...values: bigint[]) => values.map((value) => filled(8, (b) => b.writeBigInt64BE(value)));

function filled(size: number, write: (bytes: Buffer) => void): Buffer {
  const bytes = Buffer.alloc(size);
  write(bytes);
  return bytes;
}
