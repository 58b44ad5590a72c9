import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { isPlainDecimal, parseDecimal, parseWhole } from '../../../daemon/intake/numbers.ts';

describe('numbers of an arrival file', () => {
  it.each([
    ['0', 0],
    ['12.5', 12.5],
    ['+3', 3],
    ['-0.25', -0.25],
    ['1e3', 1000],
    ['1.5E-3', 0.0015],
    ['007', 7],
  ])('reads %s', (text, value) => expect(parseDecimal(text)).toBe(value));

  it.each([
    ...[
      '',
      ' ',
      '+',
      '-',
      '.',
      '5.',
      '.5',
      '1e',
      'e5',
      '1e400',
      '-1e400',
      'NaN',
      'nan',
      'inf',
      'Infinity',
      '0x10',
      '0b1',
    ],
    ...[
      '1_000',
      '1,5',
      '1 000',
      ' 12',
      '12 ',
      '1.0D5',
      '1.2.3',
      '--1',
      '١٢',
      '１２',
      '12\u200b',
      '1\0',
      '1'.repeat(101),
    ],
  ])('A15 refuses %j', (text) => expect(parseDecimal(text)).toBeNull());

  it('reads back every finite double that JavaScript writes', () => {
    fc.assert(
      fc.property(fc.double({ noNaN: true, noDefaultInfinity: true }), (value) => {
        expect(parseDecimal(String(value))).toBe(value === 0 ? 0 : value);
      }),
    );
  });

  it('accepts no text that is not its own digits', () => {
    fc.assert(
      fc.property(fc.string({ unit: fc.constantFrom(...'0123456789+-.eE_ x,') }), (text) => {
        if (parseDecimal(text) !== null) expect(text).toMatch(/^[+-]?\d+(\.\d+)?([eE][+-]?\d+)?$/);
      }),
      { numRuns: 2000 },
    );
  });

  it('takes whole numbers that a double holds', () => {
    expect(parseWhole('-12')).toBe(-12);
    expect(Object.is(parseWhole('-0'), 0)).toBe(true);
    expect(parseWhole('9007199254740991')).toBe(9007199254740991);
    for (const text of ['9007199254740992', '1.0', '1e3', '', '0x1']) expect(parseWhole(text)).toBeNull();
  });

  it('takes dates without sign and exponent', () => {
    expect(isPlainDecimal('58035.55557789103333022')).toBe(true);
    for (const text of ['-5', '+5', '5e4', '58035.', '']) expect(isPlainDecimal(text)).toBe(false);
  });
});
