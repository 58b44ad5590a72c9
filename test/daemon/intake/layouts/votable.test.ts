import { describe, expect, it } from 'vitest';
import { readVotable } from '../../../../daemon/intake/layouts/votable.ts';

// IVOA VOTable 1.4 (REC-VOTable-1.4-20191021). What BINARY2 means is checked on files written by astropy (astropy.test.ts).
const FIELDS = `<FIELD name="pulsar" datatype="char" arraysize="*"/>
<FIELD name="mjd_utc" datatype="char" arraysize="*"/>
<FIELD name="uncertainty_us" datatype="double" unit="ns"/>
<FIELD name="frequency_mhz" datatype="float" unit="GHz"/>
<FIELD name="site" datatype="char" arraysize="*"/>
<FIELD name="pulse_number" datatype="int"><VALUES null="-1"/></FIELD>`;
const GOOD =
  '<TR><TD>KR 0417+31</TD><TD>60975.8912345678901234</TD><TD>38200</TD><TD>1.4</TD><TD>ridge</TD><TD>-1</TD></TR>';
const table = (data: string, fields = FIELDS) => `<TABLE>\n${fields}\n<DATA>${data}</DATA></TABLE>`;
const file = (inside: string, before = '') =>
  `<?xml version="1.0"?>\n${before}<VOTABLE version="1.4" xmlns="http://www.ivoa.net/xml/VOTable/v1.3"><RESOURCE>${inside}</RESOURCE></VOTABLE>\n`;
const read = (text: string) => readVotable(Buffer.from(text));
const rowsOf = (rows: string) => read(file(table(`<TABLEDATA>\n${rows}\n</TABLEDATA>`)));

describe('a VOTable', () => {
  it('gives its rows in our units, with every digit as it stands', () => {
    const { rows, rejects, fault, warnings } = rowsOf(GOOD);
    expect({ rejects, fault }).toEqual({ rejects: [], fault: null });
    expect(rows).toMatchObject([
      { line: 1, timeText: '60975.8912345678901234', uncertaintyUs: 38.2, frequencyMhz: 1400, pulseNumber: null },
    ]);
    expect(warnings).toHaveLength(2);
  });

  it('reads prefixed names, CDATA, comments and the entities of XML', () => {
    const name = 'KR &lt;1&gt; &amp; &#x2b;<!-- no -->';
    const { rows } = rowsOf(GOOD.replace('KR 0417+31', name).replace('ridge', '<![CDATA[ri]]>dge'));
    expect(rows).toMatchObject([{ pulsar: 'KR <1> & +', site: 'ridge' }]);
    const prefixed = file(table(`<TABLEDATA>${GOOD}</TABLEDATA>`)).replaceAll(/<(\/?)([A-Z])/g, '<$1v:$2');
    expect(read(prefixed).rows).toHaveLength(1);
  });

  it('refuses a FIELD outside the head of its table: which cell it would name is a guess', () => {
    const stray = '<FIELD name="mjd_utc" datatype="char" arraysize="*"/>';
    const within = read(file(`<TABLE>\n${FIELDS}\n<DATA>${stray}<TABLEDATA>${GOOD}</TABLEDATA></DATA></TABLE>`));
    const behind = read(file(`<TABLE>\n${FIELDS}\n<DATA><TABLEDATA>${GOOD}</TABLEDATA></DATA>${stray}</TABLE>`));
    for (const { rows, fault } of [within, behind]) {
      expect(rows).toEqual([]);
      expect(fault).toMatch(/FIELD stands outside the head/);
    }
  });

  it('keeps good rows beside bad ones, and says row, XML line and column', () => {
    const { rows, rejects } = rowsOf([GOOD, GOOD.replace('38200', 'NaN'), '<TR><TD>x</TD></TR>', GOOD].join('\n'));
    expect(rows.map(({ line }) => line)).toEqual([1, 4]);
    expect(rejects).toMatchObject([
      { line: 2, column: 'uncertainty_us', reason: 'is empty (XML line 11)' },
      { line: 3, column: null, reason: 'has 1 cells, the table 6 fields (XML line 12)' },
    ]);
  });

  it('counts rows through several tables, and names a table that holds none', () => {
    const data = table(`<TABLEDATA>${GOOD}</TABLEDATA>`);
    const other = table('<TABLEDATA><TR><TD>1</TD></TR></TABLEDATA>', '<FIELD name="x" datatype="int"/>');
    const { rows, warnings } = read(file(data + other + data));
    expect(rows.map(({ line }) => line)).toEqual([1, 2]);
    expect(warnings.at(-1)).toMatch(/passed over: table 2 .* no column pulsar/);
  });

  it('A41 refuses a DOCTYPE, and with it every bomb and every way out', () => {
    const bomb = `<!DOCTYPE v [<!ENTITY a "aaaaaaaaaa">${'bcdefghij'
      .split('')
      .map((n, i) => `<!ENTITY ${n} "${`&${'abcdefghij'[i]};`.repeat(10)}">`)
      .join('')}]>`;
    const outside = '<!DOCTYPE v SYSTEM "file:///etc/passwd">';
    for (const doctype of [bomb, outside, '<!DOCTYPE VOTABLE>']) {
      expect(read(file(table(`<TABLEDATA>${GOOD}</TABLEDATA>`), doctype)).fault).toMatch(/a DOCTYPE is not taken/);
    }
    expect(rowsOf(GOOD.replace('ridge', '&ridge;')).fault).toMatch(/line 10, column \d+: undefined entity/);
  });

  it('A41 bounds depth, fields and what a stream may claim', () => {
    expect(read(file('<RESOURCE>'.repeat(100))).fault).toMatch(/nested more than 50 deep/);
    expect(read(file(table('', '<FIELD name="x" datatype="int"/>'.repeat(201)))).fault).toMatch(/more than 200 fields/);
    // A text that says it is four thousand million characters long.
    const stream = Buffer.concat([Buffer.from([0]), Buffer.alloc(4, 0xff), Buffer.from('x')]).toString('base64');
    const claim = read(file(table(`<BINARY2><STREAM encoding="base64">${stream}</STREAM></BINARY2>`)));
    expect(claim.fault).toMatch(/its stream ends inside a row/);
  });

  it.each([
    ['<BINARY2><STREAM href="http://127.0.0.1/x" encoding="base64"/></BINARY2>', /nothing is fetched/],
    ['<BINARY2><STREAM encoding="gzip">AAAA</STREAM></BINARY2>', /encoding must be base64/],
    ['<BINARY2><STREAM encoding="base64">A*==</STREAM></BINARY2>', /not base64/],
    ['<BINARY><STREAM encoding="base64">AAAA</STREAM></BINARY>', /form BINARY are not read/],
    ['<FITS extnum="1"><STREAM encoding="base64">AAAA</STREAM></FITS>', /form FITS are not read/],
    ['<TABLEDATA><TR><TD>a<TD>b</TD></TD></TR></TABLEDATA>', /an element stands inside a cell/],
  ])('is refused with %s', (data, fault) => expect(read(file(table(data))).fault).toMatch(fault));

  it('A2 is taken for a growing file while its end is missing', () => {
    const whole = file(table(`<TABLEDATA>${GOOD}</TABLEDATA>`));
    for (let length = 30; length < whole.length - 3; length += 23) {
      expect(read(whole.slice(0, length))).toMatchObject({ rows: [], unterminated: true, fault: expect.any(String) });
    }
  });

  it('A12 is UTF-8 and nothing else, and a VOTable and nothing else', () => {
    expect(read('<html/>').fault).toMatch(/is not a VOTable: its root is html/);
    expect(read('pulsar,mjd_utc\n').fault).toMatch(/line 2, column 2: text data outside/);
    expect(readVotable(Buffer.from('\ufeff<VOTABLE/>', 'utf16le')).fault).toMatch(/UTF-16/);
    expect(readVotable(Buffer.from([0x3c, 0xff, 0x3e])).fault).toBe('is not UTF-8 text');
    expect(read('<?xml version="1.0" encoding="ISO-8859-1"?><VOTABLE/>').fault).toMatch(/encoding ISO-8859-1/);
    expect(read('<VOTABLE/>').fault).toBe('holds no table with data');
  });
});
