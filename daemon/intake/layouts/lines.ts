import { isUtf8 } from 'node:buffer';
import { LONGEST_LINE_BYTES } from './csvRecords.ts';

const LF = 0x0a;
const CR = 0x0d;

export interface TextLine {
  /** Counted from 1. */
  readonly line: number;
  /** Without its end; null: see `problem`. */
  readonly text: string | null;
  readonly problem: string;
}

/** The lines of a file, ended by LF or CRLF. */
export function* textLines(bytes: Buffer): Generator<TextLine> {
  let line = 0;
  for (let start = 0; start < bytes.length; ) {
    line += 1;
    const found = bytes.indexOf(LF, start);
    const next = found < 0 ? bytes.length : found;
    const end = next > start && bytes[next - 1] === CR ? next - 1 : next;
    const content = bytes.subarray(start, end);
    start = next + 1;
    if (content.length > LONGEST_LINE_BYTES) {
      yield { line, text: null, problem: `longer than ${LONGEST_LINE_BYTES} bytes` };
    } else if (isUtf8(content)) yield { line, text: content.toString('utf8'), problem: '' };
    else yield { line, text: null, problem: 'not UTF-8 text' };
  }
}
