import { isUtf8 } from 'node:buffer';
import { visibleText } from '../visibleText.ts';

/**
 * File names are bytes: one that is not UTF-8 is read like any other. For records and screens each name has one writing, and
 * each writing means one name: what is invisible or not UTF-8 is escaped, and so is the backslash.
 */
export function displayName(bytes: Buffer): string {
  if (isUtf8(bytes)) return visibleText(bytes.toString('utf8'));
  let text = '';
  for (let start = 0; start < bytes.length; ) {
    const length = [1, 2, 3, 4].find(
      (size) => start + size <= bytes.length && isUtf8(bytes.subarray(start, start + size)),
    );
    if (length === undefined) text += `\\x${bytes[start]!.toString(16).padStart(2, '0')}`;
    else text += visibleText(bytes.toString('utf8', start, start + length));
    start += length ?? 1;
  }
  return text;
}

const DOT = 0x2e;
const TILDE = 0x7e;
const UNFINISHED_ENDINGS = ['.tmp', '.part'];

/** Hidden names and those that writers use until a file is whole. */
export function isPassedOver(name: Buffer): boolean {
  if (name[0] === DOT || name[name.length - 1] === TILDE) return true;
  const ending = name.subarray(-5).toString('latin1').toLowerCase();
  return UNFINISHED_ENDINGS.some((unfinished) => ending.endsWith(unfinished));
}

const SLASH = Buffer.from('/');

export function joinBytes(folder: Buffer, name: Buffer): Buffer {
  return folder.length === 0 ? name : Buffer.concat([folder, SLASH, name]);
}
