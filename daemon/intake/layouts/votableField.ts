import { isUtf8 } from 'node:buffer';
import { quoted } from '../../visibleText.ts';
import type { TypedColumn } from './arrivalTable.ts';
import { doubleText, singleText } from './binaryNumbers.ts';

/** One FIELD of a table (IVOA VOTable 1.4, sections 2 and 4): what its cells are, as text and in BINARY2. */
export interface VotableField extends TypedColumn {
  /** Why its cells cannot be read; null: they can. It matters only where the field is one of ours. */
  readonly trouble: string | null;
  /** The text that stands for no value (VALUES null="…"); null: none. */
  readonly nullText: string | null;
  readonly datatype: string;
  readonly size: ArraySize | null;
}

/** Elements of a cell. `variable`: BINARY2 says how many before each. */
export type ArraySize = { readonly elements: number } | 'variable';

/** Bits an element takes in BINARY2 (table 5). */
const BITS: Readonly<Record<string, number>> = {
  boolean: 8,
  bit: 1,
  unsignedByte: 8,
  short: 16,
  int: 32,
  long: 64,
  char: 8,
  unicodeChar: 16,
  float: 32,
  double: 64,
  floatComplex: 64,
  doubleComplex: 128,
};
const TYPES: Readonly<Record<string, TypedColumn['type']>> = {
  unsignedByte: 'whole',
  short: 'whole',
  int: 'whole',
  long: 'whole',
  char: 'text',
  unicodeChar: 'text',
  float: 'single',
  double: 'double',
};

/** The attributes that we look at, of any element. */
export type Attributes = Partial<Readonly<Record<AttributeName, string>>>;
type AttributeName = 'name' | 'ID' | 'datatype' | 'arraysize' | 'unit' | 'null' | 'ref' | 'href' | 'encoding';

export function votableField(attributes: Attributes): VotableField {
  const datatype = attributes.datatype ?? '';
  const arraysize = attributes.arraysize ?? '';
  const size = sizeOf(arraysize);
  const type = Object.hasOwn(TYPES, datatype) ? TYPES[datatype]! : null;
  return {
    name: (attributes.name ?? attributes.ID ?? '').trim(),
    unit: (attributes.unit ?? '').trim(),
    type: type ?? 'text',
    trouble: troubleOf({ datatype, arraysize, type, size }),
    nullText: null,
    datatype,
    size,
  };
}

/** Null: several dimensions, or no size at all. */
function sizeOf(arraysize: string): ArraySize | null {
  if (arraysize === '') return { elements: 1 };
  if (/^[0-9]{1,9}$/.test(arraysize)) return { elements: Number(arraysize) };
  return /^[0-9]{0,9}\*$/.test(arraysize) ? 'variable' : null;
}

function troubleOf(field: {
  datatype: string;
  arraysize: string;
  type: TypedColumn['type'] | null;
  size: ArraySize | null;
}): string | null {
  const { datatype, arraysize, type, size } = field;
  if (type === null) return `has the datatype ${quoted(datatype)}, which holds neither text nor a number`;
  if (size === null) return `has the arraysize ${quoted(arraysize)}: one text or number a row is wanted`;
  const isOne = size !== 'variable' && size.elements === 1;
  return type === 'text' || isOne ? null : `has the arraysize ${quoted(arraysize)}: one number a row is wanted`;
}

/** The text of a TD; empty where it stands for no value. */
export function cellText(field: VotableField, content: string): string {
  const text = content.replace(/^[ \t\r\n]+|[ \t\r\n]+$/g, '');
  if (text === field.nullText) return '';
  if (field.type !== 'single' && field.type !== 'double') return text;
  if (/^nan$/i.test(text)) return '';
  const infinite = /^([+-]?)inf$/i.exec(text);
  if (infinite === null) return text;
  return infinite[1] === '-' ? '-inf' : 'inf';
}

/** Where a cell's content begins and how many elements it has; null: it reaches beyond the end, or its size is not known. */
export function binaryCell(
  field: VotableField,
  bytes: Buffer,
  at: number,
): { readonly start: number; readonly elements: number; readonly end: number } | null {
  if (field.size === null || !Object.hasOwn(BITS, field.datatype)) return null;
  const isVariable = field.size === 'variable';
  if (isVariable && at + 4 > bytes.length) return null;
  const elements = field.size === 'variable' ? bytes.readUInt32BE(at) : field.size.elements;
  const start = isVariable ? at + 4 : at;
  const end = start + Math.ceil((elements * BITS[field.datatype]!) / 8);
  return end <= bytes.length ? { start, elements, end } : null;
}

/** Null for bytes that are no text. Numbers are big-endian (section 6). */
export function binaryText(field: VotableField, bytes: Buffer, start: number, elements: number): string | null {
  switch (field.datatype) {
    case 'char':
      return textOf(bytes.subarray(start, start + elements));
    case 'unicodeChar':
      return unicodeOf(bytes.subarray(start, start + 2 * elements));
    case 'float':
      return singleText(bytes.readFloatBE(start));
    case 'double':
      return doubleText(bytes.readDoubleBE(start));
    default: {
      const text = `${wholeAt(field.datatype, bytes, start)}`;
      return text === field.nullText ? '' : text;
    }
  }
}

function wholeAt(datatype: string, bytes: Buffer, start: number): bigint | number {
  if (datatype === 'long') return bytes.readBigInt64BE(start);
  if (datatype === 'int') return bytes.readInt32BE(start);
  return datatype === 'short' ? bytes.readInt16BE(start) : bytes.readUInt8(start);
}

/** A zero byte ends it early. */
function textOf(bytes: Buffer): string | null {
  const end = bytes.indexOf(0);
  const text = end < 0 ? bytes : bytes.subarray(0, end);
  return isUtf8(text) ? text.toString('utf8').trim() : null;
}

function unicodeOf(bytes: Buffer): string | null {
  const text = Buffer.from(bytes).swap16().toString('utf16le');
  // With the u flag only half a pair matches.
  return /[\ud800-\udfff]/u.test(text) ? null : text.split('\0', 1)[0]!.trim();
}
