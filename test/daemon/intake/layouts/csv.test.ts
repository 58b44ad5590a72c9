import { describe, expect, it } from 'vitest';
import { readCsv } from '../../../../daemon/intake/layouts/csv.ts';

const HEADER = 'pulsar,mjd_utc,uncertainty_us,frequency_mhz,site,receiver,pulse_number,signal_to_noise,note';
const GOOD = 'KR 0417+31,60123.4567890123456789,12.5,1400.25,ridge,L,-17,23.5,first light';
const read = (text: string | Buffer) => readCsv(Buffer.from(text));
const rowWith = (changes: Record<string, string>) => {
  const columns = HEADER.split(',');
  const values = GOOD.split(',').map((value, index) => changes[columns[index]!] ?? value);
  return read(`${HEADER}\n${values.join(',')}\n`);
};

describe('an arrival file', () => {
  it('is read with every digit and every column', () => {
    const { rows, rejects, fault, unterminated } = read(`${HEADER}\n${GOOD}\n`);
    expect({ rejects, fault, unterminated }).toEqual({ rejects: [], fault: null, unterminated: false });
    expect(rows).toEqual([
      {
        line: 2,
        pulsar: 'KR 0417+31',
        timeText: '60123.4567890123456789',
        timeScale: 'UTC',
        time: { day: 60123, fraction: 0.4567890123456789 },
        uncertaintyUs: 12.5,
        frequencyMhz: 1400.25,
        site: 'ridge',
        receiver: 'L',
        pulseNumber: -17,
        signalToNoise: 23.5,
        note: 'first light',
      },
    ]);
  });

  it('takes columns in any order, leaves out the optional ones, and names those it does not know', () => {
    const file = read('site,frequency_mhz,mjd_tdb,pulsar,uncertainty_us,reciever\nbarycentre,inf,60000.5,KR 1,3,x\n');
    expect(file.rows[0]).toMatchObject({
      timeScale: 'TDB',
      frequencyMhz: Number.POSITIVE_INFINITY,
      receiver: '',
      note: null,
    });
    expect(file.ignoredColumns).toEqual(['reciever (did you mean receiver?)']);
  });

  it('keeps its good rows when others are bad, and accounts for each', () => {
    const { rows, rejects } = read(`${HEADER}\n${GOOD}\nKR 1,2\n\n${GOOD.replace('12.5', '0')}\n${GOOD}\n`);
    expect(rows.map(({ line }) => line)).toEqual([2, 6]);
    expect(rejects).toEqual([
      { line: 3, column: null, reason: 'has 2 fields, the header 9' },
      {
        line: 5,
        column: 'uncertainty_us',
        reason: '"0" must be larger than 0 and at most 10000000 µs',
        pulsar: 'KR 0417+31',
      },
    ]);
  });

  it('A2 marks a last row without a line end, for its last number may be cut short', () => {
    expect(read(`${HEADER}\n${GOOD}`).unterminated).toBe(true);
    expect(read(`${HEADER}\r\n${GOOD}\r`).unterminated).toBe(true);
    expect(read(`${HEADER}\n${GOOD}\n`).unterminated).toBe(false);
  });

  it.each([
    [
      'pulsar,mjd_utc,uncertainty_us,site\n',
      'line 1, the header: no column frequency_mhz; found "pulsar", "mjd_utc", "uncertainty_us", "site"',
    ],
    ['\n\n', 'holds no header and no rows'],
    ['', 'is empty'],
    [`${HEADER},note\n`, 'line 1, the header: the column "note" stands there twice'],
    [`${HEADER}\r${GOOD}\r`, 'line 1, the header: lines end in CR alone; deliver it with LF or CRLF'],
  ])('cannot be read whole: %j', (text, fault) => expect(read(text)).toMatchObject({ fault, rows: [], rejects: [] }));

  it('A11 quarantines binary junk whole', () => {
    const junk = Buffer.from(Array.from({ length: 100_000 }, (_, index) => (index * 7919 + (index >> 3) * 31) % 256));
    const compressed = Buffer.from([0x1f, 0x8b, 8, 0, 0, 0, 0, 0, 0, 3, 0x4b, 0x4c]);
    const program = Buffer.from('\x7fELF\x02\x01\x01\0\0\0\0\0\0\0\0\0');
    for (const bytes of [junk, compressed, program]) expect(read(bytes).fault).not.toBeNull();
  });

  it('A11 quarantines a file whole in which thousands of rows are bad and few are good', () => {
    const { fault } = read(`${HEADER}\n${GOOD}\n${'junk,junk\n'.repeat(20_000)}`);
    expect(fault).toBe('more than 10000 rows cannot be used, the first on line 3: has 2 fields, the header 9');
  });

  it('A12 says what UTF-16 is and loses only the rows that are not UTF-8', () => {
    expect(read(Buffer.from(`\ufeff${HEADER}\n`, 'utf16le')).fault).toBe('is UTF-16 text; deliver it as UTF-8');
    for (const bad of [[0xff], [0xc0, 0xaf], [0xed, 0xa0, 0x80]]) {
      const file = Buffer.concat([Buffer.from(`${HEADER}\n${GOOD},`), Buffer.from(bad), Buffer.from(`\n${GOOD}\n`)]);
      expect(read(file)).toMatchObject({ rows: [{ line: 3 }], rejects: [{ line: 2, reason: 'not UTF-8 text' }] });
    }
  });

  it('A13 refuses a row with zero bytes, and names a tail of zeros', () => {
    expect(read(`${HEADER}\n${GOOD}\0x\n${GOOD}\n`)).toMatchObject({
      rows: [{ line: 3 }],
      rejects: [{ line: 2, column: 'note' }],
    });
    const reason = '4096 zero bytes stand at the end of the file';
    const tail = Buffer.alloc(4096);
    const behindLine = read(Buffer.concat([Buffer.from(`${HEADER}\n${GOOD}\n`), tail]));
    expect(behindLine).toMatchObject({ rows: [{ line: 2 }], rejects: [{ line: 3, reason }], unterminated: false });
    const insideRow = read(Buffer.concat([Buffer.from(`${HEADER}\n${GOOD}\n${GOOD}`), tail]));
    expect(insideRow).toMatchObject({ rows: [{ line: 2 }], rejects: [{ line: 3, reason }], unterminated: false });
  });

  it('A14 reads the same rows whatever the line ends, blanks, tabs and mark at the front', () => {
    const lines = [HEADER, GOOD, GOOD.replace('60123', '60124')];
    const plain = read(`${lines.join('\n')}\n`).rows;
    const forms = [
      lines.join('\r\n'),
      `\ufeff${lines.join('\n')}`,
      `${lines[0]}\r\n${lines[1]}\n${lines[2]}\r\n`,
      lines.map((line) => line.replaceAll(',', ' ,\t')).join(' \r\n'),
      lines
        .map((line) =>
          line
            .split(',')
            .map((field) => `"${field}"`)
            .join(','),
        )
        .join('\n'),
    ];
    for (const form of forms) expect(read(form).rows).toEqual(plain);
    expect(
      read(`${HEADER}\n${GOOD}\f\n${GOOD.replace('ridge', 'rid\rge')}\n`).rejects.map(({ column }) => column),
    ).toEqual(['note', 'site']);
  });

  it.each(['NaN', 'Inf', 'inf', '1e400', '0x1', '1_000', '１２', '1.0D5', '+', ''])(
    'A15 refuses %j as an uncertainty',
    (text) => {
      expect(rowWith({ uncertainty_us: text })).toMatchObject({
        rows: [],
        rejects: [{ line: 2, column: 'uncertainty_us' }],
      });
    },
  );

  it('A15 takes a comma for what it is: one column too many', () => {
    expect(rowWith({ uncertainty_us: '1,5' }).rejects).toEqual([
      { line: 2, column: null, reason: 'has 10 fields, the header 9' },
    ]);
  });

  it.each([
    ['uncertainty_us', '0'],
    ['uncertainty_us', '-0'],
    ['uncertainty_us', '-3'],
    ['uncertainty_us', '10000001'],
    ['frequency_mhz', '0'],
    ['frequency_mhz', '-1400'],
    ['frequency_mhz', 'Infinity'],
    ['signal_to_noise', '-1'],
    ['pulse_number', '1.5'],
    ['pulse_number', '9007199254740993'],
  ] as const)('A16 refuses %s = %s', (column, text) => {
    expect(rowWith({ [column]: text })).toMatchObject({ rows: [], rejects: [{ column }] });
  });

  it('A17 keeps a 20-digit day fraction as text and to 1e-15 d', () => {
    const timeText = '60123.12345678901234567890';
    const row = rowWith({ mjd_utc: timeText }).rows[0]!;
    expect(row.timeText).toBe(timeText);
    // By whole numbers: the fraction in units of 1e-20 d.
    const exact = 12345678901234567890n;
    const found = (BigInt(Math.round(row.time.fraction * 2 ** 53)) * 10n ** 20n) / 2n ** 53n;
    const error = found > exact ? found - exact : exact - found;
    expect(error < 100_000n).toBe(true);
  });

  it.each(['0', '1000000', '-5', '39999.9', '80000', '6e4', '60123.', '60123,5'])('A23 refuses the date %j', (text) => {
    expect(rowWith({ mjd_utc: text }).rows).toEqual([]);
  });

  it('refuses a barycentric time that is not at the barycentre, and the other way round', () => {
    expect(rowWith({ site: 'barycentre' }).rejects).toMatchObject([{ column: 'site' }]);
    expect(read('pulsar,mjd_tdb,uncertainty_us,frequency_mhz,site\nKR 1,60000,1,inf,ridge\n').rejects).toMatchObject([
      { column: 'site' },
    ]);
    expect(
      read('pulsar,mjd_utc,mjd_tdb,uncertainty_us,frequency_mhz,site\nKR 1,60000,60000,1,1,ridge\n').rejects,
    ).toMatchObject([{ column: null, reason: 'has both mjd_utc and mjd_tdb: one of them must be empty' }]);
  });

  it('A26 takes strange names as names and refuses those that could pose as others', () => {
    for (const pulsar of ['__proto__', 'constructor', '../x', '<img onerror>', '=cmd', "O'Hara; --"]) {
      expect(rowWith({ pulsar }).rows[0]?.pulsar).toBe(pulsar);
    }
    for (const pulsar of ['KR\u202e1', 'KR\u0007', 'KR\u2028', 'x'.repeat(65), '']) {
      expect(rowWith({ pulsar })).toMatchObject({ rows: [], rejects: [{ column: 'pulsar' }] });
    }
    expect(rowWith({ pulsar: 'KR\u202e1' }).rejects[0]?.reason).toBe(
      '"KR\\u{202e}1" holds control or invisible characters',
    );
  });
});
