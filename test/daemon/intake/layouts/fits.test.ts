import { describe, expect, it } from 'vitest';
import { readFits } from '../../../../daemon/intake/layouts/fits.ts';
import {
  card,
  doubles,
  type FitsTestColumn,
  fitsTable,
  floats,
  ints,
  longs,
  text,
} from '../../../support/fitsTable.ts';

const pulsar: FitsTestColumn = { name: 'pulsar', form: '12A', cells: text(12, 'KR 0417+31', 'KR 0009-1') };
const time: FitsTestColumn = { name: 'mjd_utc', form: '24A', cells: text(24, '60975.8912345678901234', '60976.5') };
const uncertainty: FitsTestColumn = { name: 'uncertainty_us', form: 'D', cells: doubles(38.2, 0.5) };
const frequency: FitsTestColumn = { name: 'frequency_mhz', form: 'E', cells: floats(1400.1, 350) };
const site: FitsTestColumn = { name: 'site', form: '6A', cells: text(6, 'ridge', 'coast') };
const GOOD = [pulsar, time, uncertainty, frequency, site];
const withColumn = (column: FitsTestColumn) => GOOD.map((good) => (good.name === column.name ? column : good));
const read = (columns: readonly FitsTestColumn[]) => readFits(fitsTable(columns));

describe('a FITS binary table', () => {
  it('gives its rows, numbers of 32 bits as the decimals that were meant', () => {
    const { rows, rejects, fault } = read(GOOD);
    expect({ rejects, fault }).toEqual({ rejects: [], fault: null });
    expect(rows).toMatchObject([
      { line: 1, timeText: '60975.8912345678901234', uncertaintyUs: 38.2, frequencyMhz: 1400.1, site: 'ridge' },
      { line: 2, timeText: '60976.5', uncertaintyUs: 0.5, frequencyMhz: 350, site: 'coast' },
    ]);
  });

  it('takes a date in one 64-bit number with a warning, unless its step drowns the uncertainty', () => {
    const { rows, rejects, warnings } = read(
      withColumn({ name: 'mjd_utc', form: 'D', cells: doubles(60975.25, 60976.5) }),
    );
    expect(rows).toMatchObject([{ line: 1, time: { day: 60975, fraction: 0.25 } }]);
    expect(rejects).toEqual([
      expect.objectContaining({
        line: 2,
        column: 'uncertainty_us',
        reason: expect.stringContaining('smaller than 0.63 µs'),
      }),
    ]);
    expect(warnings).toEqual([expect.stringContaining('HDU 2: the column mjd_utc is one 64-bit number')]);
  });

  it('adds a fraction to a whole or half day, and to nothing else', () => {
    const days = { name: 'mjd_utc', form: 'D', cells: doubles(60975.5, 60976.3) };
    const { rows, rejects } = read([
      ...withColumn(days),
      { name: 'mjd_utc_fraction', form: 'D', cells: doubles(-0.25, 0.1) },
    ]);
    expect(rows).toMatchObject([{ timeText: '60975.25' }]);
    expect(rejects).toMatchObject([
      { line: 2, column: 'mjd_utc', reason: expect.stringContaining('a whole day is wanted') },
    ]);
  });

  it('scales whole numbers exactly, also those beyond a double, and knows nulls', () => {
    // Unsigned 64-bit numbers are stored less 2^63 (FITS Standard 4.0, table 19).
    const numbers = {
      name: 'pulse_number',
      form: 'K',
      cells: longs(-(2n ** 63n) + 5n, -7n),
      cards: { TZERO: '9223372036854775808', TNULL: '-7' },
    };
    const scaled = {
      name: 'uncertainty_us',
      form: 'J',
      cells: ints(382, 5),
      cards: { TSCAL: '1.0E-01', TZERO: '0.25D0' },
    };
    const { rows } = read([...withColumn(scaled), numbers]);
    expect(rows).toMatchObject([
      { uncertaintyUs: 38.45, pulseNumber: 5 },
      { uncertaintyUs: 0.75, pulseNumber: null },
    ]);
  });

  it('refuses rows, not the file, for what stands in them', () => {
    const bad = { name: 'uncertainty_us', form: 'D', cells: doubles(Number.NaN, Number.POSITIVE_INFINITY) };
    expect(read(withColumn(bad)).rejects).toMatchObject([
      { line: 1, column: 'uncertainty_us', reason: 'is empty (row 1 of HDU 2)' },
      { line: 2, column: 'uncertainty_us', reason: '"inf" is not a decimal number (row 2 of HDU 2)' },
    ]);
    const notText = { name: 'site', form: '6A', cells: [Buffer.from('ri\xffge ', 'latin1'), Buffer.from('coast\0')] };
    expect(read(withColumn(notText))).toMatchObject({
      rows: [{ site: 'coast' }],
      rejects: [{ column: 'site', reason: 'is not UTF-8 text (row 1 of HDU 2)' }],
    });
  });

  it.each([
    [
      withColumn({ name: 'mjd_utc', form: 'E', cells: floats(60975, 60976) }),
      /mjd_utc holds 32-bit numbers, too coarse/,
    ],
    [withColumn({ ...uncertainty, cards: { TUNIT: "'Jy'" } }), /uncertainty_us has the unit "Jy"; known: d, s, ms/],
    [withColumn({ ...time, cards: { TUNIT: "'s'" } }), /mjd_utc has the unit "s"; days are wanted/],
    [withColumn({ name: 'uncertainty_us', form: '2E', cells: doubles(0, 0) }), /holds 2 numbers a row/],
    [withColumn({ name: 'site', form: '1PA(5)', cells: doubles(0, 0) }), /variable length are not read/],
    [withColumn({ ...uncertainty, cards: { TSCAL: "'x'" } }), /TSCAL3 or TZERO3 that is no number/],
    [GOOD.slice(1), /HDU 2: no column pulsar; found "mjd_utc"/],
    [[...GOOD, site], /the column "site" stands there twice/],
    [withColumn({ ...site, form: '7A' }), /its columns take 55 bytes a row, NAXIS1 says 54/],
  ])('cannot be read whole: %#', (columns, fault) => {
    expect(read(columns)).toMatchObject({ rows: [], rejects: [], fault: expect.stringMatching(fault) });
  });

  it('A2 A7 is taken for a growing file at every length but its own', () => {
    const whole = fitsTable(GOOD);
    for (let length = 10; length < whole.length - 2880; length += 97) {
      const cut = readFits(whole.subarray(0, length));
      // Up to the end of a header, there is simply no table yet.
      expect(cut.fault).not.toBeNull();
      expect(cut.unterminated || cut.fault === 'holds no binary table').toBe(true);
    }
  });

  it('A9 refuses sizes that are larger than the file, however they are stated', () => {
    const whole = fitsTable(GOOD).toString('latin1');
    for (const [from, to] of [
      [/NAXIS2 {2}= {20}2/, 'NAXIS2  =       999999999999999'],
      [/PCOUNT {2}= {20}0/, 'PCOUNT  =      999999999999999'],
      [/GCOUNT {2}= {20}1/, 'GCOUNT  =      999999999999999'],
      [/NAXIS2 {2}= {20}2/, 'NAXIS2  =                   -2'],
      [/TFIELDS = {20}5/, 'TFIELDS =                 5000'],
    ] as const) {
      const changed = whole.replace(from, (found) => to.padEnd(found.length).slice(0, found.length));
      expect(changed).not.toBe(whole);
      expect(readFits(Buffer.from(changed, 'latin1')).fault).not.toBeNull();
    }
  });

  it('takes a heap behind the rows for what it is: not ours', () => {
    const heap = Buffer.alloc(10_000, 7);
    expect(readFits(fitsTable(GOOD, { heap })).rows).toHaveLength(2);
  });

  it('passes over nothing in silence: junk behind the table is a fault, a table of something else a warning', () => {
    const whole = fitsTable(GOOD);
    expect(readFits(Buffer.concat([whole, Buffer.from('junk'.repeat(720))])).fault).toMatch(
      /HDU 3: does not begin with XTENSION/,
    );
    const other = fitsTable([{ name: 'x', form: 'D', cells: doubles(1) }]).subarray(2880);
    const both = readFits(Buffer.concat([whole, other]));
    expect(both.rows).toHaveLength(2);
    expect(both.warnings).toEqual([expect.stringContaining('passed over: HDU 3: no column pulsar')]);
    expect(readFits(Buffer.concat([whole, whole.subarray(2880)])).rows.map(({ line }) => line)).toEqual([1, 2, 3, 4]);
  });

  it('is not taken for one when it is something else', () => {
    expect(readFits(Buffer.from('pulsar,mjd_utc\n')).fault).toMatch(/is not a FITS file/);
    expect(readFits(Buffer.alloc(0)).fault).toBe('is empty');
    const unquoted = fitsTable(GOOD).toString('latin1').replace("'24A'", " 24A'");
    expect(readFits(Buffer.from(unquoted, 'latin1')).fault).toMatch(/TFORM2 is no text in quotes/);
    expect(readFits(fitsTable(GOOD, { extra: [card('BAD', '\x07')] })).fault).toMatch(/is not plain text/);
  });
});
