/** Writes SPK kernels by the book (NAIF, *DAF Required Reading*, *SPK Required Reading*), for the reader's tests. */
export interface SpkArray {
  readonly target: number;
  readonly centre: number;
  readonly frame?: number;
  readonly type: 2 | 3;
  /** TDB seconds from J2000. */
  readonly firstS: number;
  readonly intervalS: number;
  /** One per interval: the series of x, y, z (type 3: and of their rates) one after the other. */
  readonly records: readonly (readonly number[])[];
  /** What the summary says; absent: all of it. */
  readonly startS?: number;
  readonly endS?: number;
}

const RECORD = 1024;
/** As many as the format allows would be 25; a small number makes the table of contents span records. */
const SUMMARIES_A_RECORD = 2;

export function spkFile(
  arrays: readonly SpkArray[],
  { littleEndian = true }: { readonly littleEndian?: boolean } = {},
): Uint8Array {
  const words = arrays.map(wordsOf);
  const summaryRecords = Math.ceil(arrays.length / SUMMARIES_A_RECORD);
  const dataStart = 1 + 2 * summaryRecords; // in records; each summary record is followed by one of names
  const total = words.reduce((sum, { length }) => sum + length, 0);
  const bytes = new Uint8Array(RECORD * dataStart + 8 * total);
  const view = new DataView(bytes.buffer);
  const int = (at: number, value: number) => view.setInt32(at, value, littleEndian);
  const double = (at: number, value: number) => view.setFloat64(at, value, littleEndian);
  const text = (at: number, value: string) => bytes.set(Buffer.from(value, 'latin1'), at);
  text(0, 'DAF/SPK ');
  int(8, 2);
  int(12, 6);
  text(16, 'invented kernel'.padEnd(60));
  int(76, 2);
  int(80, 2 * summaryRecords);
  int(84, (RECORD / 8) * dataStart + total + 1);
  text(88, littleEndian ? 'LTL-IEEE' : 'BIG-IEEE');
  text(699, 'FTPSTR:\r:\n:\r\n:\r\0:\x81:\x10\xce:ENDFTP');
  let word = (RECORD / 8) * dataStart + 1;
  for (let block = 0; block < summaryRecords; block++) {
    const record = RECORD * (1 + 2 * block);
    const here = arrays.slice(block * SUMMARIES_A_RECORD, (block + 1) * SUMMARIES_A_RECORD);
    double(record, block + 1 < summaryRecords ? 4 + 2 * block : 0);
    double(record + 8, block === 0 ? 0 : 2 * block);
    double(record + 16, here.length);
    text(record + RECORD, ' '.repeat(RECORD));
    for (const [i, array] of here.entries()) {
      const at = record + 24 + 40 * i;
      const mine = words[block * SUMMARIES_A_RECORD + i]!;
      double(at, array.startS ?? array.firstS);
      double(at + 8, array.endS ?? array.firstS + array.intervalS * array.records.length);
      const last = word + mine.length - 1;
      for (const [k, value] of [array.target, array.centre, array.frame ?? 1, array.type, word, last].entries()) {
        int(at + 16 + 4 * k, value);
      }
      for (const [k, value] of mine.entries()) double(8 * (word - 1 + k), value);
      word = last + 1;
    }
  }
  return bytes;
}

function wordsOf({ firstS, intervalS, records }: SpkArray): number[] {
  const half = intervalS / 2;
  const series = records.flatMap((record, i) => [firstS + i * intervalS + half, half, ...record]);
  return [...series, firstS, intervalS, 2 + (records[0]?.length ?? 0), records.length];
}

/** The bytes of a kernel in memory, as the reader asks for them. */
export function inMemory(bytes: Uint8Array) {
  return { byteLength: bytes.length, bytes: (from: number, to: number) => bytes.subarray(from, to) };
}
