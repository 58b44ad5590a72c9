import assert from 'node:assert/strict';
import { type Layout, readArrivalFile } from '../../daemon/intake/layouts/read.ts';
import type { TextColumns } from '../../daemon/intake/layouts/textColumns.ts';
import type { ArrivalFile, ReceivedRow } from '../../daemon/intake/rows.ts';
import { loadTables } from '../../daemon/tables/loadTables.ts';
import { configuredColumns } from './feedLayout.ts';
import { doubles, fitsTable, floats, text } from './fitsTable.ts';
import { type SlowRow, slowFitsRow, slowMjd, slowTextRow, slowVotableRow } from './slowLayouts.ts';

/**
 * Files of every layout but CSV (which has a test of its own), damaged at random. Whatever the bytes, no reader may throw or take
 * long, and every row that is accepted must be what a slow reader of our own reads at the same place.
 */
export interface MutationCount {
  readonly files: number;
  readonly whole: number;
  readonly faults: number;
  readonly rows: number;
  readonly rejects: number;
  readonly slowestMs: number;
}

const TABLE = `separator = "blanks"
exponent_letters = "dD"
time = { column = 2, format = "mjd" }
uncertainty = { column = 3, unit = "us" }
frequency = { column = 4, unit = "MHz" }
pulsar = { column = 1 }
site = { fixed = "ridge" }
`;

interface Kind {
  readonly layout: Layout;
  readonly make: (rows: readonly Made[]) => Buffer;
  readonly slow: (bytes: Buffer, row: number) => SlowRow | null;
}

interface Made {
  readonly pulsar: string;
  readonly mjd: string;
  readonly uncertainty: number;
  readonly frequency: number;
  readonly site: string;
}

/** Every kind in turn, `files` in all or until `isTimeUp`. The same seed makes the same files. */
export function readMutatedFiles(seed: number, files: number, isTimeUp = () => false): MutationCount {
  const random = generator(seed);
  const columns = configuredColumns(TABLE).columns!;
  const kinds = kindsWith(columns);
  const { leapSeconds } = loadTables().tables;
  const count = { files: 0, whole: 0, faults: 0, rows: 0, rejects: 0, slowestMs: 0 };
  while (count.files < files && !isTimeUp()) {
    const { layout, make, slow } = kinds[count.files % kinds.length]!;
    const original = make(Array.from({ length: 1 + random(4) }, () => madeRow(random)));
    const bytes = mutated(original, random);
    const start = performance.now();
    const file = readArrivalFile(bytes, layout, { path: 'night', leapSeconds });
    count.slowestMs = Math.max(count.slowestMs, performance.now() - start);
    check(file, (row) => slow(bytes, row), `seed ${seed}, file ${count.files + 1}, ${layout.layout}`);
    count.files += 1;
    count.whole += bytes.equals(original) ? 1 : 0;
    count.faults += file.fault === null ? 0 : 1;
    count.rows += file.rows.length;
    count.rejects += file.rejects.length;
  }
  return count;
}

function check(file: ArrivalFile, slow: (row: number) => SlowRow | null, where: string): void {
  if (file.fault !== null) assert.deepEqual([file.rows, file.rejects], [[], []], where);
  for (const row of file.rows) checkRow(row, slow(row.line), `${where}, row ${row.line}`);
}

function checkRow(row: ReceivedRow, slow: SlowRow | null, where: string): void {
  assert.notEqual(slow, null, where);
  assert.deepEqual([row.pulsar, row.site], [slow!.pulsar, slow!.site], where);
  const exact = slowMjd(slow!.mjd);
  assert.equal(slowMjd(row.timeText), exact, where);
  // The fraction is a double: within half its last place of the digits.
  const found = BigInt(row.time.day) * 10n ** 30n + slowMjd(row.time.fraction.toFixed(25))!;
  const error = found > exact! ? found - exact! : exact! - found;
  assert.ok(error <= 10n ** 15n, where);
  assert.ok(row.time.day >= 40_000 && row.time.day <= 80_000, where);
  assert.equal(row.uncertaintyUs, slow!.uncertaintyUs, where);
  // A 32-bit number stands for the shortest decimal that is nearest to it.
  assert.ok(Math.fround(row.frequencyMhz) === Math.fround(slow!.frequencyMhz), where);
  assert.ok(row.uncertaintyUs > 0 && row.uncertaintyUs <= 1e7 && row.frequencyMhz > 0, where);
}

function kindsWith(columns: TextColumns): readonly Kind[] {
  return [
    { layout: { layout: 'fits', columns: null }, make: fitsOf, slow: slowFitsRow },
    {
      layout: { layout: 'votable', columns: null },
      make: votableOf,
      slow: (bytes, row) => slowVotableRow(bytes.toString('utf8'), row),
    },
    {
      layout: { layout: 'columns', columns },
      make: textOf,
      slow: (bytes, row) => slowTextRow(bytes.toString('utf8'), row),
    },
  ];
}

function fitsOf(rows: readonly Made[]): Buffer {
  return fitsTable([
    { name: 'pulsar', form: '12A', cells: text(12, ...rows.map(({ pulsar }) => pulsar)) },
    { name: 'mjd_utc', form: '24A', cells: text(24, ...rows.map(({ mjd }) => mjd)) },
    { name: 'uncertainty_us', form: 'D', cells: doubles(...rows.map(({ uncertainty }) => uncertainty)) },
    { name: 'frequency_mhz', form: 'E', cells: floats(...rows.map(({ frequency }) => frequency)) },
    { name: 'site', form: '6A', cells: text(6, ...rows.map(({ site }) => site)) },
  ]);
}

function votableOf(rows: readonly Made[]): Buffer {
  const fields = [
    ...['pulsar', 'mjd_utc', 'site'].map((name) => `<FIELD name="${name}" datatype="char" arraysize="*"/>`),
    ...['uncertainty_us', 'frequency_mhz'].map((name) => `<FIELD name="${name}" datatype="double"/>`),
  ];
  const cells = rows.map(({ pulsar, mjd, site, uncertainty, frequency }) =>
    [pulsar, mjd, site, uncertainty, frequency].map((cell) => `<TD>${cell}</TD>`).join(''),
  );
  const data = cells.map((row) => `<TR>${row}</TR>\n`).join('');
  return Buffer.from(
    `<VOTABLE><RESOURCE><TABLE>\n${fields.join('\n')}\n<DATA><TABLEDATA>\n${data}</TABLEDATA></DATA></TABLE></RESOURCE></VOTABLE>\n`,
  );
}

function textOf(rows: readonly Made[]): Buffer {
  const lines = rows.map(({ pulsar, mjd, uncertainty, frequency }) =>
    [pulsar.replace(' ', ''), mjd, `${uncertainty}D0`, frequency].join('  '),
  );
  return Buffer.from(`# ${'a remark '.repeat(3)}\n${lines.join('\n')}\n`);
}

type Random = (below: number) => number;

function madeRow(random: Random): Made {
  const digits = Array.from({ length: 1 + random(18) }, () => random(10)).join('');
  return {
    pulsar: ['KR 0417+31', 'KR 0009-1', 'KR1'][random(3)]!,
    mjd: `${50_000 + random(12_000)}.${digits}`,
    uncertainty: (1 + random(100_000)) / 1000,
    frequency: (1000 + random(30_000)) / 8,
    site: ['ridge', 'coast'][random(2)]!,
  };
}

const LETTERS = Buffer.from(' \n\t\r0123456789.+-eEdD<>&;"\'=/#x\0');

/** None to four changes; a run of random bytes now and then. */
function mutated(original: Buffer, random: Random): Buffer {
  let bytes = Buffer.from(original);
  for (let changes = random(5); changes > 0; changes -= 1) {
    const at = random(bytes.length + 1);
    const [front, back] = [bytes.subarray(0, at), bytes.subarray(at)];
    const letter = Buffer.from([random(2) === 0 ? LETTERS[random(LETTERS.length)]! : random(256)]);
    const how = random(20);
    if (how === 0) bytes = Buffer.from(front);
    else if (how === 1)
      bytes = Buffer.concat([front, Buffer.from(Array.from({ length: random(30) }, () => random(256))), back]);
    else if (how === 2)
      bytes = Buffer.concat([front, bytes.subarray(random(bytes.length + 1)).subarray(0, random(200)), back]);
    else if (how < 6) bytes = Buffer.concat([front, letter, back]);
    else if (how < 9) bytes = Buffer.concat([front, back.subarray(1)]);
    else bytes = Buffer.concat([front, letter, back.subarray(1)]);
  }
  return bytes;
}

/** Numbers below a bound from a 32-bit state (xorshift, Marsaglia 2003, Journal of Statistical Software 8, 14). */
function generator(seed: number): Random {
  let state = (seed ^ 0x9e3779b9) >>> 0 || 1;
  return (below) => {
    state ^= state << 13;
    state >>>= 0;
    state ^= state >>> 17;
    state ^= state << 5;
    state >>>= 0;
    return Math.floor((state / 2 ** 32) * below);
  };
}
