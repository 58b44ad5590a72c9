import { describe, expect, it } from 'vitest';
import { readColumns } from '../../../../daemon/intake/layouts/columns.ts';
import { loadTables } from '../../../../daemon/tables/loadTables.ts';
import { configuredColumns } from '../../../support/feedLayout.ts';

const { leapSeconds } = loadTables().tables;
const BLANKS = `separator = "blanks"
time = { column = 2, format = "mjd" }
uncertainty = { column = 3, unit = "us" }
frequency = { column = 4, unit = "MHz" }
pulsar = { column = 1 }
site = { fixed = "ridge" }
`;
function read(table: string, text: string, path = 'night.txt') {
  const { columns, complaints } = configuredColumns(table);
  expect(complaints).toEqual([]);
  return readColumns(Buffer.from(text), columns!, { path, leapSeconds });
}

describe('a text table as the feed describes it', () => {
  it('is read with comments, lines to skip, missing values, codes of sites and Fortran numbers', () => {
    const table = `separator = "blanks"
skip_lines = 2
comment_marks = ["C ", "!"]
exponent_letters = "Dd"
missing_marks = ["-"]
time = { column = 2, format = "mjd" }
uncertainty = { column = 3, unit = "s" }
frequency = { column = 4, unit = "GHz", infinite_marks = ["0"] }
pulsar = { column = 1, names = { "0417" = "KR 0417+31", "0009" = "KR 0009-1" } }
site = { column = 5, names = { "7" = "ridge", "@" = "barycentre", "b" = "coast" } }
receiver = { column = 6 }
pulse_number = { column = 7 }
signal_to_noise = { column = 8 }
`;
    const text = `header
of two lines
C a remark
  0417 60975.8912345678901234 3.82D-05\t1.4 7 L -17 .5

! another
0009 60976.0 1.d-6 0 b - - -
0009 60976.5 1.E-6 1.4 zz L - -
`;
    const { rows, rejects } = read(table, text);
    expect(rows).toMatchObject([
      { line: 4, pulsar: 'KR 0417+31', timeText: '60975.8912345678901234', uncertaintyUs: 38.2, frequencyMhz: 1400 },
      { line: 7, pulsar: 'KR 0009-1', uncertaintyUs: 1, frequencyMhz: Number.POSITIVE_INFINITY, site: 'coast' },
    ]);
    expect(rows).toMatchObject([
      { receiver: 'L', pulseNumber: -17, signalToNoise: 0.5 },
      { receiver: '', pulseNumber: null, signalToNoise: null },
    ]);
    expect(rejects).toMatchObject([
      {
        line: 8,
        column: 'site',
        reason: `(column 5) "zz" is not among the feed's names ("7", "@", "b"): add it to them and start again`,
      },
    ]);
  });

  it('says line and column of what is wrong', () => {
    const { rejects } = read(BLANKS, 'KR1 60975.1 x 1400\nKR1 6e4 1 1400\nKR1 60975.1 1D5 1400\nKR1 60975.1 1\n');
    expect(rejects.map(({ line, column, reason }) => `${line} ${column} ${reason}`)).toEqual([
      '1 uncertainty_us (column 3) "x" is not a decimal number',
      '3 uncertainty_us (column 3) "1D5" is not a decimal number',
      '4 frequency_mhz (column 4) is empty',
    ]);
    expect(read(`column_count = 4\n${BLANKS}`, 'KR1 60975.1 1 1400 x\n').rejects[0]?.reason).toBe(
      'has 5 columns; column_count says 4',
    );
  });

  it('is read by fixed positions, where a tab tells nothing', () => {
    const table = `time = { characters = [8, 21], format = "mjd" }
uncertainty = { characters = [22, 26], unit = "ns" }
frequency = { characters = [27, 31], unit = "MHz" }
pulsar = { characters = [1, 7] }
site = { fixed = "ridge" }
note = { characters = [32, 60] }
`;
    const { rows, rejects } = read(
      table,
      'KR 0417 60975.891234  500 1400 as seen, twice\nKR 0417\t60975.891234  500 1400\n',
    );
    expect(rows).toMatchObject([
      { pulsar: 'KR 0417', timeText: '60975.891234', uncertaintyUs: 0.5, frequencyMhz: 1400, note: 'as seen, twice' },
    ]);
    expect(rejects).toEqual([{ line: 2, column: null, reason: 'holds a tab: its fixed positions cannot be told' }]);
  });

  it('takes pulsar and receiver from the name of the file', () => {
    const table = BLANKS.replace(
      'pulsar = { column = 1 }',
      'pulsar = { from_file_name = true, names = { "0417" = "KR 0417+31" } }\nreceiver = { from_file_name = true }',
    ).replace('separator', 'file_name = "KR{pulsar}_{receiver:2}*.txt"\nseparator');
    const line = 'x 60975.1 1 1400\n';
    expect(read(table, line, 'sub/KR0417_L1-night.txt').rows).toMatchObject([{ pulsar: 'KR 0417+31', receiver: 'L1' }]);
    expect(read(table, line, 'KR9999_L1.txt').rejects).toMatchObject([
      { column: 'pulsar', reason: expect.stringContaining('(from the file\'s name) "9999"') },
    ]);
    for (const name of ['KR0417.txt', 'KR_L1.txt', 'KR0417_L.txt', 'KR0417_L1.txt.gz']) {
      expect(read(table, line, name).fault).toMatch(/does not fit the pattern/);
    }
  });

  it.each([
    // Astronomical Almanac: JD 2 451 544.5 is 2000-01-01 0h, MJD 51 544.
    ['format = "jd"', '2451544.5000000000000001', '51544.0000000000000001'],
    ['format = "jd"', '2461545.123', '61544.623'],
    ['format = "iso8601"', '2000-01-01T12:00:00Z', '51544.5'],
    ['format = "iso8601"', '2026-03-29T00:00:00.000000000864', '61128.00000000000001'],
    // The leap second at the end of 2016 (IERS Bulletin C 52): the day has 86 401 s, and second 60 a place of its own.
    ['format = "iso8601"', '2016-12-31T23:59:60', '57753.9999884260598835661623361'],
    ['format = "iso8601"', '2016-12-31T12:00:00.5', '57753.5'],
  ])('%s: %s is MJD %s, to the last digit', (format, text, mjd) => {
    const table = BLANKS.replace('format = "mjd"', format);
    const { rows, rejects } = read(table, `KR1 ${text} 1 1400\n`);
    expect(rejects).toEqual([]);
    expect(rows[0]?.timeText.slice(0, 27)).toBe(mjd.slice(0, 27));
  });

  it.each([
    ['format = "iso8601"', '2015-12-31T23:59:60'],
    ['format = "iso8601"', '2016-12-31T22:59:60'],
    ['format = "iso8601"', '2026-02-29T00:00:00'],
    ['format = "iso8601"', '2026-03-29'],
    ['format = "iso8601"', '2026-03-29T24:00:00'],
    ['format = "jd"', '61128.5'],
    ['format = "mjd"', '-61128.5'],
  ])('%s: %s is refused', (format, text) => {
    const { rows, rejects } = read(BLANKS.replace('format = "mjd"', format), `KR1 ${text} 1 1400\n`);
    expect(rows).toEqual([]);
    expect(rejects).toMatchObject([{ line: 1, column: 'mjd_utc' }]);
  });

  it.each([
    [
      'rest_column = 5, rest_unit = "d", format = "mjd"',
      '61128',
      '0.12345678901234567890',
      '61128.12345678901234567890',
    ],
    ['rest_column = 5, rest_unit = "s", format = "mjd"', '61128', '8640.00000000864', '61128.1000000000001'],
    ['rest_column = 5, rest_unit = "us", format = "mjd"', '61128', '43200000000', '61128.5'],
    ['rest_column = 5, rest_unit = "clock", format = "iso8601"', '2026-03-29', '06:00:00', '61128.25'],
  ])('a time in two columns: %s', (keys, day, rest, mjd) => {
    const table = BLANKS.replace('format = "mjd"', keys);
    expect(read(table, `KR1 ${day} 1 1400 ${rest}\n`).rows).toMatchObject([{ timeText: mjd }]);
  });

  it('refuses a rest outside its day, and one behind half a day', () => {
    const table = BLANKS.replace('format = "mjd"', 'rest_column = 5, rest_unit = "s", format = "mjd"');
    const { rejects } = read(table, 'KR1 61128 1 1400 86400\nKR1 61128.5 1 1400 1\nKR1 61128 1 1400 -1\n');
    expect(rejects.map(({ line, column }) => [line, column])).toEqual([
      [1, 'mjd_utc'],
      [2, 'mjd_utc'],
      [3, 'mjd_utc'],
    ]);
  });

  it('A2 A11 A12 A13: growing files, junk, wrong encodings and tails of zeros are told as in CSV', () => {
    expect(read(BLANKS, 'KR1 60975.1 1 1400').unterminated).toBe(true);
    expect(read(BLANKS, '').fault).toBe('is empty');
    expect(read(BLANKS, 'KR1\0 60975.1 1 1400\n').fault).toMatch(/holds zero bytes/);
    expect(read(BLANKS, `${'x'.repeat(70_000)}\nKR1 60975.1 1 1400\r\n`)).toMatchObject({
      rows: [{ line: 2 }],
      rejects: [{ line: 1 }],
    });
    expect(read(BLANKS, `KR1 60975.1 1 1400\n${'\0'.repeat(4096)}`)).toMatchObject({
      rows: [{ line: 1 }],
      rejects: [{ line: 2 }],
    });
    expect(read(BLANKS, 'bad line\n'.repeat(10_002)).fault).toMatch(/more than 10000 rows cannot be used/);
  });
});

describe('the description of a text table', () => {
  it.each([
    ['column = 1 }', 'colum = 1 }', 'feed 1, columns, pulsar, colum: unknown key; did you mean "column"?'],
    [
      'unit = "us"',
      'unit = "sec"',
      'feed 1, columns, uncertainty, unit: must be one of "d", "s", "ms", "us", "µs", "μs", "ns", found "sec"',
    ],
    [
      'fixed = "ridge"',
      'fixed = "rigde"',
      'feed 1, columns, site, fixed: there is no [[site]] "rigde"; did you mean "ridge"?',
    ],
    [
      'fixed = "ridge"',
      'column = 5, names = { "7" = "rdige" }',
      'feed 1, columns, site, names, 7: there is no [[site]] "rdige"; did you mean "ridge"?',
    ],
    [
      '{ column = 1 }',
      '{ column = 1, fixed = "x" }',
      'feed 1, columns, pulsar: must say where it stands, in one way: column, from_file_name or fixed',
    ],
    [
      '{ column = 1 }',
      '{ from_file_name = true }',
      'feed 1, columns, pulsar, from_file_name: needs file_name with {pulsar} in it',
    ],
    [
      '{ column = 1 }',
      '{ characters = [1, 5] }',
      'feed 1, columns, pulsar, characters: goes with no separator; with one say column = N',
    ],
    [
      'separator = "blanks"',
      'skip_lines = -1',
      'feed 1, columns, skip_lines: must be a whole number between 0 and 10000, found -1',
    ],
    [
      'separator',
      'file_name = "{pulsar}{site}"\nseparator',
      'feed 1, columns, file_name: "{site}" follows a gap of any length: text must stand between them',
    ],
    [
      'separator',
      'file_name = "{name}"\nseparator',
      'feed 1, columns, file_name: "{name}" is not one of {pulsar}, {site}, {receiver}, or {pulsar:7}',
    ],
    [
      'format = "mjd"',
      'format = "mjd", rest_column = 3',
      'feed 1, columns, time, rest_unit: is missing: what is the rest counted in?',
    ],
    ['site = { fixed = "ridge" }\n', '', 'feed 1, columns, site: is missing'],
  ])('%s → %s', (from, to, complaint) => {
    expect(configuredColumns(BLANKS.replace(from, to)).complaints).toContain(complaint);
  });
});
