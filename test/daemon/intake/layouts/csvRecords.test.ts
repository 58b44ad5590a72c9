import { describe, expect, it } from 'vitest';
import { csvRecords, LONGEST_LINE_BYTES } from '../../../../daemon/intake/layouts/csvRecords.ts';

const read = (text: string | Buffer) => [...csvRecords(Buffer.from(text))];

describe('CSV as RFC 4180 has it', () => {
  // The examples of RFC 4180, section 2, rules 1 to 7.
  it.each([
    [
      'rule 1, lines',
      'aaa,bbb,ccc\r\nzzz,yyy,xxx\r\n',
      [
        ['aaa', 'bbb', 'ccc'],
        ['zzz', 'yyy', 'xxx'],
      ],
    ],
    [
      'rule 2, no last line break',
      'aaa,bbb,ccc\r\nzzz,yyy,xxx',
      [
        ['aaa', 'bbb', 'ccc'],
        ['zzz', 'yyy', 'xxx'],
      ],
    ],
    [
      'rule 5, quotes',
      '"aaa","bbb","ccc"\r\nzzz,yyy,xxx',
      [
        ['aaa', 'bbb', 'ccc'],
        ['zzz', 'yyy', 'xxx'],
      ],
    ],
    [
      'rule 6, line break in quotes',
      '"aaa","b\r\nbb","ccc"\r\nzzz,yyy,xxx',
      [
        ['aaa', 'b\nbb', 'ccc'],
        ['zzz', 'yyy', 'xxx'],
      ],
    ],
    ['rule 7, doubled quotes', '"aaa","b""bb","ccc"', [['aaa', 'b"bb', 'ccc']]],
  ])('%s', (_rule, text, fields) => {
    expect(read(text).map((record) => 'fields' in record && record.fields)).toEqual(fields);
  });

  it('counts lines as an editor does, over blank lines and quoted line breaks', () => {
    const text = 'a,b\n\n1,"x\ny"\n \t \n2,z\n';
    expect(read(text)).toEqual([
      { line: 1, fields: ['a', 'b'] },
      { line: 3, fields: ['1', 'x\ny'] },
      { line: 6, fields: ['2', 'z'] },
    ]);
  });

  it('loses only the line of a quote that was left open', () => {
    const text = 'a,b,c\n1,"open,3\n4,5,6\n7,8,"9"\n10,11,12\n';
    expect(read(text)).toEqual([
      { line: 1, fields: ['a', 'b', 'c'] },
      { line: 2, problem: 'a quote is opened on this line and not closed' },
      { line: 3, fields: ['4', '5', '6'] },
      { line: 4, fields: ['7', '8', '9'] },
      { line: 5, fields: ['10', '11', '12'] },
    ]);
  });

  it.each([
    ['a"b,c', 'a quote stands inside a field that does not begin with one'],
    ['"a"b,c', 'text stands behind a closing quote'],
    ['"a', 'a quote is opened on this line and not closed'],
  ])('refuses %j', (text, problem) => expect(read(text)).toEqual([{ line: 1, problem }]));

  it('A10 passes over a line without end, and reads on behind it', () => {
    const long = Buffer.alloc(5_000_000, '1');
    const file = Buffer.concat([Buffer.from('a,b\n'), long, Buffer.from('\n1,2\n')]);
    expect(read(file)).toEqual([
      { line: 1, fields: ['a', 'b'] },
      { line: 2, problem: `longer than ${LONGEST_LINE_BYTES} bytes` },
      { line: 3, fields: ['1', '2'] },
    ]);
  });

  it('is not slowed down by quotes and blanks made to slow it down', () => {
    const openQuotes = Buffer.from('"x\n'.repeat(20_000));
    const blanks = Buffer.from(`${`a${' '.repeat(60_000)}b\n`.repeat(30)}`);
    expect(read(openQuotes).length).toBe(20_000);
    expect(read(blanks).length).toBe(30);
  });
});
