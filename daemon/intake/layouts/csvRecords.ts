import { isUtf8 } from 'node:buffer';

/**
 * CSV as RFC 4180 has it, read so that one broken line costs that line alone. Lines may end in LF or CRLF; blanks round a field
 * do not count; blank lines are passed over.
 *
 * A quoted field may run over lines (RFC 4180, section 2.6), unless one of the lines inside it has as many fields as the header:
 * then somebody forgot to close a quote, only the line with the open quote is refused, and the rows behind it are kept.
 */
export type CsvRecord =
  | { readonly line: number; readonly fields: readonly string[] }
  | { readonly line: number; readonly problem: string };

export const LONGEST_LINE_BYTES = 64 * 1024;
const MOST_LINES_OF_A_RECORD = 20;
const LF = 0x0a;
const CR = 0x0d;

/** The lines of a file as records, the header first. */
export function* csvRecords(bytes: Buffer): Generator<CsvRecord> {
  let width = Number.POSITIVE_INFINITY;
  let line = 0;
  for (let start = 0; start < bytes.length; ) {
    line += 1;
    const end = lineEnd(bytes, start);
    const record = recordAt(bytes, { start, end, line, width });
    start = end + 1;
    if (record === null) continue;
    if ('fields' in record) {
      if (width === Number.POSITIVE_INFINITY) width = record.fields.length;
      for (let extra = record.lines - 1; extra > 0; extra -= 1) {
        start = lineEnd(bytes, start) + 1;
        line += 1;
      }
      yield { line: line - record.lines + 1, fields: record.fields };
    } else {
      yield { line, problem: record.problem };
    }
  }
}

/** Where the line that begins at `start` ends: the place of its LF, or the end of the file. */
function lineEnd(bytes: Buffer, start: number): number {
  const end = bytes.indexOf(LF, start);
  return end < 0 ? bytes.length : end;
}

interface Fields {
  readonly fields: string[];
  /** Physical lines the record takes. */
  readonly lines: number;
}
interface Problem {
  readonly problem: string;
}
interface LinePlace {
  readonly start: number;
  readonly end: number;
  readonly line: number;
  readonly width: number;
}

/** Null for a blank line. */
function recordAt(bytes: Buffer, { start, end, width }: LinePlace): Fields | Problem | null {
  if (end - start > LONGEST_LINE_BYTES) return { problem: `longer than ${LONGEST_LINE_BYTES} bytes` };
  const text = textBetween(bytes, start, end);
  if (text === null) return { problem: 'not UTF-8 text' };
  if (/^[ \t]*$/.test(text)) return null;
  if (!text.includes('"')) return { fields: text.split(',').map(trimmed), lines: 1 };
  const alone = quotedFields(text);
  if (alone !== 'open') return Array.isArray(alone) ? { fields: alone, lines: 1 } : alone;
  return overLines(bytes, start, width);
}

/** Without the CR of a CRLF; null when it is not UTF-8. */
function textBetween(bytes: Buffer, start: number, end: number): string | null {
  const last = end > start && bytes[end - 1] === CR ? end - 1 : end;
  return isUtf8(bytes.subarray(start, last)) ? bytes.toString('utf8', start, last) : null;
}

const OPEN_QUOTE: Problem = { problem: 'a quote is opened on this line and not closed' };

/** A record whose quoted field runs over the line's end: takes in line by line until the quote is closed. */
function overLines(bytes: Buffer, start: number, width: number): Fields | Problem {
  const parts: string[] = [];
  let from = start;
  for (let lines = 1; lines <= MOST_LINES_OF_A_RECORD && from < bytes.length; lines += 1) {
    const end = lineEnd(bytes, from);
    if (end - start > LONGEST_LINE_BYTES) return OPEN_QUOTE;
    const part = textBetween(bytes, from, end);
    if (part === null || (lines > 1 && part.split(',').length >= width)) return OPEN_QUOTE;
    parts.push(part);
    from = end + 1;
    if (lines === 1 || !part.includes('"')) continue;
    const fields = quotedFields(parts.join('\n'));
    if (Array.isArray(fields)) return { fields, lines };
    if (fields !== 'open') return OPEN_QUOTE;
  }
  return OPEN_QUOTE;
}

/** `open`: the text ends inside quotes. */
function quotedFields(text: string): string[] | 'open' | Problem {
  const fields: string[] = [];
  let at = 0;
  for (;;) {
    if (text[at] === '"') {
      const close = closingQuote(text, at);
      if (close < 0) return 'open';
      fields.push(trimmed(text.slice(at + 1, close).replaceAll('""', '"')));
      at = close + 1;
      while (isBlank(text[at])) at += 1;
      if (at < text.length && text[at] !== ',') return { problem: 'text stands behind a closing quote' };
    } else {
      const comma = text.indexOf(',', at);
      const field = text.slice(at, comma < 0 ? text.length : comma);
      if (field.includes('"')) return { problem: 'a quote stands inside a field that does not begin with one' };
      fields.push(trimmed(field));
      at += field.length;
    }
    if (at >= text.length) return fields;
    at += 1;
  }
}

/** A doubled quote stands for one and closes nothing; −1: there is none. */
function closingQuote(text: string, open: number): number {
  for (let at = text.indexOf('"', open + 1); at >= 0; at = text.indexOf('"', at + 2)) {
    if (text[at + 1] !== '"') return at;
  }
  return -1;
}

/** Blanks and tabs alone: anything else that looks like a blank is a fault to be shown. */
function trimmed(field: string): string {
  let from = 0;
  let to = field.length;
  while (from < to && isBlank(field[from])) from += 1;
  while (to > from && isBlank(field[to - 1])) to -= 1;
  return field.slice(from, to);
}

function isBlank(character: string | undefined): boolean {
  return character === ' ' || character === '\t';
}
