import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { displayName, isPassedOver } from '../../../daemon/watch/fileName.ts';

describe('file names', () => {
  it.each([
    ['kr.csv', 'kr.csv'],
    ['Ω 1.csv', 'Ω 1.csv'],
    ['a\nb', 'a\\u{a}b'],
    ['a\u202eb', 'a\\u{202e}b'],
    ['a\\xffb', 'a\\\\xffb'],
  ])('A26 writes %j as %s', (name, shown) => expect(displayName(Buffer.from(name))).toBe(shown));

  it('A26 escapes a byte that is not UTF-8, and so keeps it apart from its escaped writing', () => {
    expect(displayName(Buffer.from([0x6b, 0x72, 0xff, 0xc3, 0xa9]))).toBe('kr\\xffé');
    expect(displayName(Buffer.from('kr\\xffé'))).toBe('kr\\\\xffé');
  });

  it('A44 gives two names two writings', () => {
    const byte = fc.constantFrom(0x5c, 0x78, 0x66, 0x75, 0x7b, 0x7d, 0xff, 0xc3, 0xa9, 0x0a);
    const name = fc.array(byte, { maxLength: 6 }).map((bytes) => Buffer.from(bytes));
    fc.assert(
      fc.property(name, name, (a, b) => {
        expect(displayName(a) === displayName(b)).toBe(a.equals(b));
      }),
      { numRuns: 2000 },
    );
    expect(displayName(Buffer.from('é'.normalize('NFC')))).not.toBe(displayName(Buffer.from('é'.normalize('NFD'))));
  });

  it('passes over hidden and unfinished files', () => {
    for (const name of ['.x.csv', 'x.csv~', 'x.tmp', 'x.csv.PART', '.'])
      expect(isPassedOver(Buffer.from(name))).toBe(true);
    for (const name of ['x.csv', 'tmp', 'x.tmp.csv', 'x~.csv', 'party'])
      expect(isPassedOver(Buffer.from(name))).toBe(false);
  });
});
