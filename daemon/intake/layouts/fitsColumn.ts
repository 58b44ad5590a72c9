import { isUtf8 } from 'node:buffer';
import { quoted } from '../../visibleText.ts';
import { type Decimal, decimalOf, decimalText, product, sum } from '../decimal.ts';
import type { TypedColumn } from './arrivalTable.ts';
import { doubleText, singleText } from './binaryNumbers.ts';
import { FitsFault } from './fitsHeader.ts';

/** One column of a binary table (FITS Standard 4.0, section 7.3): where it lies in a row and how its bytes become text. */
export interface FitsColumn extends TypedColumn {
  /** In bytes. */
  readonly width: number;
  /** Why its contents cannot be read; null: they can. It matters only where the column is one of ours. */
  readonly trouble: string | null;
  /** The value that begins at a byte, as text; empty for a null, null for bytes that are no text. */
  textAt(bytes: Buffer, start: number): string | null;
}

/** Bytes an element (table 18). */
const WIDTHS: Readonly<Record<string, number>> = {
  L: 1,
  B: 1,
  I: 2,
  J: 4,
  K: 8,
  A: 1,
  E: 4,
  D: 8,
  C: 8,
  M: 16,
  P: 8,
  Q: 16,
};
const ONE: Decimal = { digits: 1n, exponent: 0 };
const ZERO: Decimal = { digits: 0n, exponent: 0 };

/** @param n counted from 1, as in TFORMn */
export function fitsColumn(cards: ReadonlyMap<string, string>, n: number, unit: number): FitsColumn {
  const form = cards.get(`TFORM${n}`) ?? '';
  const match = /^([0-9]{0,9})([LXBIJKAEDCMPQ])(.*)$/.exec(form);
  if (match === null) throw new FitsFault(`HDU ${unit}: TFORM${n} = ${quoted(form)} is no form of a column`);
  const repeat = match[1] === '' ? 1 : Number(match[1]);
  const code = match[2]!;
  const width = code === 'X' ? Math.ceil(repeat / 8) : repeat * WIDTHS[code]!;
  const scaling = scalingOf(cards, n);
  const nullValue = nullOf(cards, n);
  return {
    name: (cards.get(`TTYPE${n}`) ?? '').trim().toLowerCase(),
    unit: (cards.get(`TUNIT${n}`) ?? '').trim(),
    type: typeOf(code),
    width,
    trouble:
      troubleOf({ code, repeat, form, dimensions: cards.get(`TDIM${n}`) ?? '' }) ??
      (scaling === 'unreadable' ? `has a TSCAL${n} or TZERO${n} that is no number` : null) ??
      (nullValue === 'unreadable' ? `has a TNULL${n} that is no whole number` : null),
    textAt:
      code === 'A'
        ? (bytes, start) => textOf(bytes, start, repeat)
        : numberReader(code, readable(scaling), readable(nullValue)),
  };
}

function typeOf(code: string): TypedColumn['type'] {
  if (code === 'E') return 'single';
  if (code === 'D') return 'double';
  return code === 'A' ? 'text' : 'whole';
}

function troubleOf(column: { code: string; repeat: number; form: string; dimensions: string }): string | null {
  const { code, repeat, form, dimensions } = column;
  if ('PQ'.includes(code))
    return `has the form ${quoted(form)}: arrays of variable length are not read; write a fixed width`;
  if (!'BIJKEDA'.includes(code)) return `has the form ${quoted(form)}; one of A, B, I, J, K, E, D is wanted`;
  if (code === 'A') return dimensions.includes(',') ? `is an array of texts (TDIM ${quoted(dimensions)})` : null;
  return repeat === 1 ? null : `holds ${repeat} numbers a row (${quoted(form)}); one is wanted`;
}

interface Scaling {
  readonly factor: Decimal;
  readonly offset: Decimal;
}

function readable<Value>(value: Value | 'unreadable'): Value | null {
  return value === 'unreadable' ? null : value;
}

/** Null: the number stands as it is. The header's own decimals are kept, so that scaled whole numbers are exact. */
function scalingOf(cards: ReadonlyMap<string, string>, n: number): Scaling | null | 'unreadable' {
  const number = (text: string | undefined, absent: Decimal) =>
    text === undefined ? absent : decimalOf(text, { exponentLetters: 'EDed' });
  const factor = number(cards.get(`TSCAL${n}`), ONE);
  const offset = number(cards.get(`TZERO${n}`), ZERO);
  if (factor === null || offset === null) return 'unreadable';
  return factor.digits === 1n && factor.exponent === 0 && offset.digits === 0n ? null : { factor, offset };
}

function nullOf(cards: ReadonlyMap<string, string>, n: number): bigint | null | 'unreadable' {
  const text = cards.get(`TNULL${n}`);
  if (text === undefined) return null;
  return /^[+-]?[0-9]{1,20}$/.test(text) ? BigInt(text.replace(/^\+/, '')) : 'unreadable';
}

/** Ends at a zero byte; blanks behind it do not count. */
function textOf(bytes: Buffer, start: number, width: number): string | null {
  const field = bytes.subarray(start, start + width);
  const end = field.indexOf(0);
  const text = end < 0 ? field : field.subarray(0, end);
  return isUtf8(text) ? text.toString('utf8').replace(/^ +| +$/g, '') : null;
}

function numberReader(code: string, scaling: Scaling | null, nullValue: bigint | null) {
  return (bytes: Buffer, start: number): string => {
    if (code === 'E' || code === 'D') {
      const text = code === 'E' ? singleText(bytes.readFloatBE(start)) : doubleText(bytes.readDoubleBE(start));
      return scaled(text, scaling);
    }
    const value = wholeAt(code, bytes, start);
    // TNULL is a value as it is stored, before it is scaled.
    return value === nullValue ? '' : scaled(`${value}`, scaling);
  };
}

/** B has no sign, the others are two's complement; big-endian. */
function wholeAt(code: string, bytes: Buffer, start: number): bigint {
  if (code === 'K') return bytes.readBigInt64BE(start);
  if (code === 'B') return BigInt(bytes.readUInt8(start));
  return BigInt(code === 'I' ? bytes.readInt16BE(start) : bytes.readInt32BE(start));
}

function scaled(text: string, scaling: Scaling | null): string {
  const value = scaling === null ? null : decimalOf(text);
  return value === null ? text : decimalText(sum(product(value, scaling!.factor), scaling!.offset));
}
